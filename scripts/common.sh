# Sourced by the other scripts: finds the root, says what runs and how long it took.
cd "$(dirname "$0")/.."
ROOT=$PWD
LOGS=$ROOT/target/logs
mkdir -p "$LOGS"
FAILED=""

say() { printf '%s: %s\n' "$(basename "$0")" "$*"; }
root() { if [ "$(id -u)" = 0 ]; then "$@"; else sudo -n "$@"; fi; }

# step NAME COMMAND…: its words go to a log, and are shown when it fails.
step() {
    name=$1
    shift
    log="$LOGS/$(printf '%s' "$name" | tr -c 'a-zA-Z0-9\n' '-').log"
    began=$(date +%s)
    printf '%-28s' "$name"
    if "$@" >"$log" 2>&1; then
        printf 'ok      %3s s\n' $(($(date +%s) - began))
    else
        printf 'FAILED  %3s s\n' $(($(date +%s) - began))
        cat "$log"
        FAILED="$FAILED
  $name"
        return 1
    fi
}

# What no build of ours installs by itself, each named with the way to get it.
need() {
    command -v "$1" >/dev/null 2>&1 || {
        say "needs $1: $2"
        exit 3
    }
}
need_cargo() { need cargo "install Rust 1.95 or later with rustup"; }
need_node() { need node "install Node.js 20 or later (Debian: apt-get install nodejs npm)"; }

# Prints a Chromium: $CHROMIUM, one that is installed, or Debian's, installed now.
chromium() {
    for b in "${CHROMIUM:-}" chromium chromium-browser google-chrome; do
        [ -n "$b" ] && command -v "$b" && return 0
    done
    if command -v apt-get >/dev/null 2>&1; then
        { root apt-get update -qq && root apt-get install -y -qq --no-install-recommends chromium; } >&2 || true
        command -v chromium && return 0
    fi
    say "needs a Chromium: name one in CHROMIUM, or as root: apt-get install chromium" >&2
    return 1
}

# The npm packages of the browser tests, outside the sources.
browser_tools() {
    mkdir -p target/npm
    if ! cmp -s tests/browser/package.json target/npm/package.json || [ ! -d target/npm/node_modules/axe-core ]; then
        cp tests/browser/package.json target/npm/package.json
        (cd target/npm && npm install --no-audit --no-fund --ignore-scripts)
    fi
}

site() { cargo run -q -p stageleaf --features site -- site "$@"; }
