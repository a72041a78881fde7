// Package demo makes an invented survey: Gull Head, a sea cliff above the
// Skerrow branch railway. Neither exists. The coordinates look like UTM zone 33
// (EPSG:32633), but the ground at that place is nothing like this.
//
// The site is an exact solid of planes, one cone and simple shapes on it. Two
// seasons of it are scanned from stations, with shadows, uneven density,
// noise, a shrub and strays, and the truth is known for everything that a
// survey of it should find and for what it should not.
//
// Inside the package positions are in the site frame: X runs along the cliff
// (towards azimuth 290°), Y out to sea (azimuth 200°), Z up, origin at the foot
// of the main face. Everything exported is in E, N, H of the working CRS.
package demo
