#!/bin/sh
# Runs every fuzz target for FUZZTIME (default 4s). Go fuzzes one target at a time.
set -eu
cd "$(dirname "$0")/.."

for package in $(go list -f '{{if or .TestGoFiles .XTestGoFiles}}{{.ImportPath}}{{end}}' ./...); do
	dir=$(go list -f '{{.Dir}}' "$package")
	targets=$(cat "$dir"/*_test.go | sed -n 's/^func \(Fuzz[A-Za-z0-9_]*\)(.*/\1/p')
	for target in $targets; do
		echo "== $package $target"
		go test -run '^$' -fuzz "^$target\$" -fuzztime "${FUZZTIME:-4s}" -parallel 2 "$package"
	done
done
