#!/bin/sh
# Compares with independent programs: GDAL's tools must be there, the Point Cloud
# Library, CGAL and R are used where they can be had. Installs what is missing
# from Debian's archive and builds the programs of testdata/reference.
set -eu
cd "$(dirname "$0")/.."

bin="$PWD/.tools/reference"
mkdir -p "$bin"

run=
if [ "$(id -u)" -ne 0 ]; then run=sudo; fi
updated=
skipped=

# need NAME... makes sure that Debian packages are there, or fails.
need() {
	missing=
	for name in "$@"; do
		dpkg-query -W -f '${Status}' "$name" 2>/dev/null | grep -q 'ok installed' || missing="$missing $name"
	done
	if [ -z "$missing" ]; then return 0; fi
	command -v apt-get >/dev/null 2>&1 || return 1
	if [ -n "$run" ] && ! command -v "$run" >/dev/null 2>&1; then return 1; fi
	update || return 1
	echo "installing$missing"
	# shellcheck disable=SC2086 # a list of names
	$run env DEBIAN_FRONTEND=noninteractive apt-get install -q -y --no-install-recommends $missing </dev/null >"$bin/apt.log" 2>&1
}

# update refreshes apt's lists once.
update() {
	if [ -n "$updated" ]; then return 0; fi
	updated=yes
	$run apt-get update -q </dev/null >"$bin/apt.log" 2>&1
}

skip() {
	skipped="$skipped $1"
	echo "$1 is left out: $2"
}

command -v gdaldem >/dev/null 2>&1 || need gdal-bin || {
	echo "gdaldem is missing and gdal-bin could not be installed; see $bin/apt.log" >&2
	exit 1
}

if ! need g++ libcgal-dev; then
	skip CGAL "libcgal-dev could not be installed"
else
	g++ -O2 -o "$bin/ellipsoid_cgal" testdata/reference/ellipsoid_cgal.cpp -lgmp -lmpfr
fi

if ! need r-base-core r-cran-cluster; then
	skip R "r-cran-cluster could not be installed"
else
	cp testdata/reference/ellipsoid.R "$bin/ellipsoid.R"
fi

# headers DIR downloads the Point Cloud Library's headers: to install its package
# would pull in 300 others and a gigabyte.
headers() {
	if [ -d "$1/usr" ]; then return 0; fi
	update || return 1
	mkdir -p "$1"
	(cd "$1" && apt-get download -q libpcl-dev && dpkg-deb -x libpcl-dev_*.deb .) >"$bin/apt.log" 2>&1
}

if ! need g++ libeigen3-dev libboost-dev || ! headers "$bin/pcl"; then
	skip PCL "libpcl-dev could not be downloaded"
else
	g++ -O1 -isystem "$(echo "$bin"/pcl/usr/include/pcl-*)" -isystem /usr/include/eigen3 \
		-o "$bin/normal_pcl" testdata/reference/normal_pcl.cpp
fi

LEDGEWORK_REFERENCE="$bin" go test -count=1 -v -tags reference -run '^TestProgram' ./fit
echo "compared with gdaldem and the programs built in $bin${skipped:+; left out:$skipped}"
