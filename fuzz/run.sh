#!/bin/sh
# Builds the targets with coverage counters and runs each named one for SECONDS (600): ./run.sh SECONDS TARGET…
# For those who lack `cargo fuzz`: an ordinary stable compiler and a C++ compiler are enough. No sanitizer: the core forbids unsafe code.
set -eu
cd "$(dirname "$0")"
seconds=$1
shift
cargo run --quiet --example seeds
passes="-Cpasses=sancov-module -Cllvm-args=-sanitizer-coverage-level=4 -Cllvm-args=-sanitizer-coverage-inline-8bit-counters"
passes="$passes -Cllvm-args=-sanitizer-coverage-pc-table -Cllvm-args=-sanitizer-coverage-trace-compares --cfg fuzzing"
host=$(rustc -vV | sed -n 's/^host: //p')
RUSTFLAGS="$passes" cargo build --quiet --release --target "$host" --bins
for target in "$@"; do
    mkdir -p "corpus/$target" "artifacts/$target"
    "${CARGO_TARGET_DIR:-target}/$host/release/$target" "corpus/$target" -artifact_prefix="artifacts/$target/" \
        -max_total_time="$seconds" -timeout=10 -rss_limit_mb=1024 -max_len=8192 -print_final_stats=1 2>"artifacts/$target.log" ||
        echo "$target: found something, see artifacts/$target.log"
    grep -E "number_of_executed_units|new_units_added" "artifacts/$target.log" | sed "s/^/$target: /"
done
