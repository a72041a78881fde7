#!/bin/sh
# terrain <- fit <- hazards <- export <- cmd: no package, and no test, imports one
# to its right; and the root package terrain imports none of ours.
set -eu
cd "$(dirname "$0")/.."

module=$(go list -m)
go list -f '
{{- $p := .ImportPath -}}
{{- range .Imports}}{{$p}} {{.}}{{"\n"}}{{end -}}
{{- range .TestImports}}{{$p}} {{.}} test{{"\n"}}{{end -}}
{{- range .XTestImports}}{{$p}} {{.}} test{{"\n"}}{{end -}}' ./... |
awk -v prefix="$module/" '
	BEGIN {
		n = split("terrain fit hazards export cmd", layers, " ")
		for (i = 1; i <= n; i++) rank[layers[i]] = i
	}
	function layer(path) {
		path = substr(path, length(prefix) + 1)
		sub("/.*", "", path)
		return path
	}
	index($1, prefix) != 1 || index($2, prefix) != 1 { next }
	!(layer($1) in rank) { print $1 " is outside the layers"; bad = 1; next }
	rank[layer($2)] > rank[layer($1)] { print $1 " must not import " $2; bad = 1 }
	$1 == prefix "terrain" && $3 != "test" && $2 != $1 { print $1 " is the model and must import none of ours, but imports " $2; bad = 1 }
	END { exit bad }'
