// Package hazards judges a fitted surface: where bulges, overhangs and
// recesses are, where a platform can be set down, and which connected ground
// is usable.
//
// What it says is a screening aid. Limits come from the caller; no default is
// a safety limit.
package hazards
