#!/bin/sh
# Makes sure that cgo can build against GDAL, on Debian and its relatives.
set -eu

missing=
command -v go >/dev/null 2>&1 || {
	echo "Go is missing: install Go 1.26 or later from https://go.dev/dl/" >&2
	exit 1
}
command -v "${CC:-gcc}" >/dev/null 2>&1 || missing="$missing gcc libc6-dev"
command -v pkg-config >/dev/null 2>&1 || missing="$missing pkg-config"
pkg-config --exists 'gdal >= 3.6' 2>/dev/null || missing="$missing libgdal-dev"
[ -z "$missing" ] && exit 0

run=
if [ "$(id -u)" -ne 0 ]; then
	if command -v sudo >/dev/null 2>&1; then
		run=sudo
	else
		echo "These packages are missing:$missing" >&2
		echo "Ask an administrator for: apt-get install$missing" >&2
		exit 1
	fi
fi
if ! command -v apt-get >/dev/null 2>&1; then
	echo "These are missing:$missing (Debian's names; GDAL 3.6 or later)" >&2
	echo "Install them with this system's package manager, then run make again." >&2
	exit 1
fi
echo "installing$missing"
export DEBIAN_FRONTEND=noninteractive
$run apt-get update -q </dev/null
# shellcheck disable=SC2086 # a list of names
$run apt-get install -q -y --no-install-recommends $missing </dev/null
pkg-config --exists 'gdal >= 3.6' || {
	echo "the libgdal-dev installed is older than 3.6: $(pkg-config --modversion gdal)" >&2
	exit 1
}
