#!/bin/sh
# Compiles crates/stageleaf-web and prints the .wasm file's path. Tries: std from source, without its panic texts and
# for size (a sixth less to load); a compiler that has the target; rustup; a rustc on PATH with std's sources.
# WASM_HOW=plain leaves the first out: quicker, larger.
set -eu
cd "$(dirname "$0")/.."
T=wasm32-unknown-unknown
MANIFEST=${WASM_MANIFEST:-crates/stageleaf-web/Cargo.toml} NAME=${WASM_NAME:-stageleaf_web}
OUT=${WASM_TARGET_DIR:-$PWD/target/wasm}   # apart: maybe another compiler
say() { printf 'wasm.sh: %s\n' "$*" >&2; }
has_std() ( # can this compiler make anything for the target?
    d=$(mktemp -d); trap 'rm -rf "$d"' EXIT
    echo '#![no_std]' >"$d/p.rs"
    "$1" "$d/p.rs" --crate-type lib --target $T --emit metadata --out-dir "$d" >"$d/log" 2>&1
)
src_rustc() ( # rustup's rustc comes first on PATH, so look further
    IFS=:
    for d in $PATH; do
        [ -x "$d/rustc" ] && s=$("$d/rustc" --print sysroot 2>&1) &&
            [ -d "$s/lib/rustlib/src/rust/library/std" ] && echo "$d/rustc" && exit 0
    done; exit 1
)
linker() { for l in wasm-ld-22 wasm-ld-21 wasm-ld-20 wasm-ld; do command -v $l && return 0; done; return 1; }
root() { if [ "$(id -u)" = 0 ]; then "$@"; else sudo -n "$@"; fi; }

own_src() { # the compiler's own std sources, by rustup where they are missing
    [ "${WASM_HOW:-}" = plain ] && return 1
    s=$(rustc --print sysroot)/lib/rustlib/src/rust/library/std
    [ -d "$s" ] || { command -v rustup && rustup component add rust-src && [ -d "$s" ]; } >&2
}
# Flags for std from source: a panic is one trap, whose text nobody could read in a page anyway. One measure of what is
# worth inlining for all crates, between those of speed (225) and of size (5).
LEAN="-Zlocation-detail=none -Zfmt-debug=none -Zunstable-options -Cpanic=immediate-abort -Cllvm-args=-inline-threshold=15"
lean() { # with rustc $1
    RUSTC=$1 RUSTC_BOOTSTRAP=1 RUSTFLAGS=$LEAN \
        cargo build -q --profile wasm --target $T -Z build-std=core,alloc,std,panic_abort \
        -Z build-std-features=optimize_for_size --manifest-path "$MANIFEST" >&2
}

how=none
if has_std rustc; then how=plain
elif command -v rustup >&2 && rustup target add $T >&2 && has_std rustc; then how=plain
else
    if { ! src_rustc || ! linker; } >&2 && command -v apt-get >&2; then
        say "no $T from rustup; trying Debian's compiler"
        { root apt-get update -qq && root apt-get install -y -qq --no-install-recommends rustc-web rust-web-src lld-22; } >&2 || true
    fi
    if src_rustc >&2 && linker >&2; then how=source; fi
fi
export CARGO_TARGET_DIR="$OUT"
case $how in
plain)  if own_src && lean rustc; then
            how=lean
        else
            cargo build -q --profile wasm --target $T --manifest-path "$MANIFEST"
        fi ;;
source) CARGO_TARGET_WASM32_UNKNOWN_UNKNOWN_LINKER=$(linker)
        export CARGO_TARGET_WASM32_UNKNOWN_UNKNOWN_LINKER
        lean "$(src_rustc)" ;;
*)      say "cannot compile for $T. Do one of these, then run this again:"
        say "  rustup target add $T"
        say "  apt-get install rustc-web rust-web-src lld-22     (Debian, as root)"
        exit 3 ;;
esac
say "compiled ($how)"
echo "$OUT/$T/wasm/$NAME.wasm"
