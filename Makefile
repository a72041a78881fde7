# make demo   builds ledgework, and the demo site into demo/
# make test   runs all tests
# Both install what is missing first: a C compiler, pkg-config and GDAL's headers.

GO ?= go

.PHONY: build demo test reference bench lint fuzz deps

build: deps
	$(GO) build -o bin/ledgework ./cmd/ledgework

demo: build
	bin/ledgework demo -o demo --overwrite

test: deps
	$(GO) test -timeout 20m ./...

# Compares with independent programs: GDAL's own tools, PCL, CGAL. Installs them.
reference: deps
	.ci/reference.sh

bench: deps
	$(GO) test -run '^$$' -bench . -benchmem ./...

lint: deps
	.ci/lint.sh

# Every fuzz target for 50 000 executions; FUZZTIME=1000000x for longer.
fuzz: deps
	.ci/fuzz.sh

deps:
	@.ci/install-deps.sh
