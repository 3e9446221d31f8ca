# make demo       run the main job on demo-grids; says where the page is
# make test       all tests
# make check      format, lints, documentation
# make bench      timed ratios (needs python3; installs numpy and scipy into target/peer)
# make calibrate  the levels in full: the null's, whose table it writes into DEVELOPERS.md, and that of contacts in noise
# make grids      make demo-grids anew from its seed

SHELL := /bin/bash
OUT ?= target/demo

.PHONY: demo test check bench calibrate grids system

demo: system
	cargo run --release --locked -- demo --out $(OUT) --replace

test: system
	cargo test --release --locked

check: system
	cargo fmt --all -- --check
	cargo clippy --release --locked --all-targets -- -D warnings
	RUSTDOCFLAGS="-D warnings" cargo doc --release --locked --no-deps --document-private-items

bench: system
	benches/peer/prepare
	PATH="$(CURDIR)/target/peer/bin:$$PATH" cargo bench --locked --bench engine --bench fields --bench whole_run

calibrate: system
	cargo bench --locked --bench calibrate -- DEVELOPERS.md
	SALBAND_LAYERS=400 cargo test --release --locked --test contact_noise -- --nocapture

grids: system
	cargo run --release --locked --example make_demo_grids -- demo-grids

# The one library that cargo cannot bring. Debian and its kin only; elsewhere install GDAL's development files first.
system:
	@if ! pkg-config --exists gdal 2>/dev/null; then \
		echo "Installing libgdal-dev and pkg-config ..."; \
		sudo=$$(test "$$(id -u)" = 0 || echo sudo); \
		$$sudo apt-get update -q && DEBIAN_FRONTEND=noninteractive $$sudo apt-get install -q -y --no-install-recommends libgdal-dev pkg-config; \
	fi
