#!/bin/sh
# No Go file has more than 400 lines, blank lines and comments not counted.
set -eu
cd "$(dirname "$0")/.."

find . -name '*.go' -not -path './.tools/*' -exec awk '
	function done() { if (lines > 400) { print name ": " lines " lines of code; split it by idea"; bad = 1 } }
	FNR == 1 { if (NR > 1) done(); name = FILENAME; lines = 0; inside = 0; generated = 0 }
	/^\/\/ Code generated .* DO NOT EDIT\.$/ { generated = 1 }
	generated { next }
	inside { if (/\*\//) inside = 0; next }
	/^[ \t]*$/ || /^[ \t]*\/\// { next }
	/^[ \t]*\/\*/ { if (!/\*\//) inside = 1; next }
	{ lines++ }
	END { done(); exit bad }' {} +
