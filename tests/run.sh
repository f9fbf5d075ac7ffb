#!/bin/bash
# Runs every test on a Debian machine, and installs first what they need and the
# machine lacks. On another system: have Go, git, a C compiler (for the race
# detector), Chromium and PostgreSQL, and run it too.
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."
export CI=true # a test that lacks what it needs fails instead of skipping

say() { printf '\n== %s\n' "$*"; }

# install NAME...: Debian packages, with whatever rights there are to do so.
install() {
	say "installing $*"
	if ! command -v apt-get >/dev/null; then
		echo "This system has no apt-get; please install what is the same as $* and run this again." >&2
		exit 1
	fi
	local as_root=()
	if [ "$(id -u)" -ne 0 ]; then as_root=(sudo); fi
	"${as_root[@]}" env DEBIAN_FRONTEND=noninteractive apt-get update -q
	"${as_root[@]}" env DEBIAN_FRONTEND=noninteractive apt-get install -qy --no-install-recommends "$@"
}

missing=()
command -v git >/dev/null || missing+=(git)
command -v gcc >/dev/null || missing+=(gcc libc6-dev)
command -v chromium >/dev/null || command -v chromium-browser >/dev/null || command -v google-chrome >/dev/null ||
	missing+=(chromium fonts-dejavu-core)
# Of PostgreSQL the tests use the programs alone and start servers of their own; the one
# that the package may set up is not touched.
command -v initdb >/dev/null || compgen -G '/usr/lib/postgresql/*/bin/initdb' >/dev/null || missing+=(postgresql)
[ -e /etc/ssl/certs/ca-certificates.crt ] || missing+=(ca-certificates)
if ! command -v go >/dev/null && [ -x /usr/local/go/bin/go ]; then PATH=/usr/local/go/bin:$PATH; fi
command -v go >/dev/null || missing+=(golang-go)
if [ ${#missing[@]} -gt 0 ]; then install "${missing[@]}"; fi

# Go 1.21 and later fetch the version that go.mod asks for by themselves.
if ! go version >/dev/null || ! go list -m >/dev/null; then
	echo "Go 1.21 or later is needed; this machine has: $(go version 2>&1)" >&2
	exit 1
fi
say "$(go version)"
go mod download

say "gofmt"
unformatted=$(gofmt -l cmd server sizing views static migrations tests)
if [ -n "$unformatted" ]; then
	echo "not formatted (run gofmt -w on them):" $unformatted >&2
	exit 1
fi

say "go vet"
go vet ./...

say "staticcheck"
go tool staticcheck ./...

status=0
say "go test"
go test -count=1 -timeout 25m ./... || status=1

say "go test -race -short"
go test -race -short -count=1 -timeout 25m ./... || status=1
exit $status
