#!/bin/sh
# Style: formatting, vet, staticcheck, golangci-lint, import direction, file size.
set -eu
cd "$(dirname "$0")/.."

staticcheck_version=v0.8.2
golangci_version=v2.15.0

# tool NAME PACKAGE VERSION WORD prints the path of a tool at that version,
# installing it into .tools/ if need be. WORD is the version as the tool says it.
tool() {
	for path in ".tools/$1" "$(go env GOPATH)/bin/$1"; do
		if [ -x "$path" ] && "$path" --version 2>/dev/null | grep -qF "$4"; then
			echo "$path"
			return
		fi
	done
	GOBIN="$PWD/.tools" GOFLAGS= timeout 600 go install "$2@$3" >&2 && echo ".tools/$1"
}

echo "== gofmt"
unformatted=$(gofmt -l cmd terrain fit hazards export)
if [ -n "$unformatted" ]; then
	echo "not formatted by gofmt: $unformatted" >&2
	exit 1
fi

echo "== go vet"
go vet ./...

echo "== import direction"
.ci/check-imports.sh

echo "== file size"
.ci/check-size.sh

echo "== staticcheck $staticcheck_version"
staticcheck=$(tool staticcheck honnef.co/go/tools/cmd/staticcheck "$staticcheck_version" "${staticcheck_version#v}")
"$staticcheck" ./...

echo "== golangci-lint $golangci_version"
# Its build takes minutes and needs hundreds of modules; where they cannot be had,
# the checks above have to do.
if golangci=$(tool golangci-lint github.com/golangci/golangci-lint/v2/cmd/golangci-lint "$golangci_version" "${golangci_version#v}"); then
	"$golangci" run
else
	echo "golangci-lint could not be installed; its checks were left out" >&2
fi
