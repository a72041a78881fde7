#!/bin/sh
# Runs every fuzz target for FUZZTIME, by default a number of executions. Go fuzzes
# one target at a time. A duration works too, but Go before 1.27 now and then fails
# at its end with "context deadline exceeded" and no input (go.dev/issue/75804).
set -eu
cd "$(dirname "$0")/.."

for package in $(go list -f '{{if or .TestGoFiles .XTestGoFiles}}{{.ImportPath}}{{end}}' ./...); do
	dir=$(go list -f '{{.Dir}}' "$package")
	targets=$(cat "$dir"/*_test.go | sed -n 's/^func \(Fuzz[A-Za-z0-9_]*\)(.*/\1/p')
	for target in $targets; do
		echo "== $package $target"
		go test -run '^$' -fuzz "^$target\$" -fuzztime "${FUZZTIME:-50000x}" -parallel 2 "$package"
	done
done
