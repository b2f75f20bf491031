#!/usr/bin/env bash
# Makes the local base image for agent and coordinator from Debian packages, without any image registry.
#
# Usage: deploy/base-image.sh [--force]
#
# Air-gapped labs need only a Debian mirror that apt already knows: its address is read from apt's own configuration at
# run time (HALFVOICE_DEBIAN_MIRROR overrides it). Any other Debian 12 like image with glibc, libssl3 and /bin/sh serves
# as well: build the images with --build-arg BASE=<that image> and skip this script.
#
# Needs root, debootstrap and a running container engine. Does nothing when the image exists, unless --force is given.
set -euo pipefail

readonly image="${HALFVOICE_BASE_IMAGE:-halfvoice-base:bookworm}"
readonly suite=bookworm

fail() {
    printf 'base-image: %s\n' "$1" >&2
    exit 1
}

# The first repository of apt's that carries the suite itself (not its security or update pockets).
mirror_of_apt() {
    apt-get indextargets --format '$(REPO_URI) $(CODENAME) $(COMPONENT)' 'Created-By: Packages' |
        awk -v suite="$suite" '!found && $2 == suite && $3 == "main" { print $1; found = 1 }'
}

case "${1:-}" in
    --force) docker image rm --force "$image" >/dev/null 2>&1 || true ;;
    '') ;;
    *) fail "unknown argument '$1'; usage: deploy/base-image.sh [--force]" ;;
esac

docker info >/dev/null 2>&1 || fail 'no container engine answers; start one (dockerd) and try again'
if docker image inspect "$image" >/dev/null 2>&1; then
    printf 'base-image: %s exists\n' "$image"
    exit 0
fi
[ "$(id -u)" -eq 0 ] || fail 'debootstrap needs root; run this script with sudo'
command -v debootstrap >/dev/null || fail 'debootstrap is missing; install it with: apt-get install debootstrap'

mirror="${HALFVOICE_DEBIAN_MIRROR:-$(mirror_of_apt)}"
[ -n "$mirror" ] || fail "apt knows no repository of Debian $suite; set HALFVOICE_DEBIAN_MIRROR to one"

scratch="$(mktemp -d)"
trap 'rm -rf --one-file-system "$scratch"' EXIT

if ! debootstrap --variant=minbase --include=libssl3,ca-certificates "$suite" "$scratch/rootfs" "$mirror" >"$scratch/log" 2>&1; then
    tail -n 20 "$scratch/log" >&2
    fail 'debootstrap failed; its last lines are above'
fi

# Package caches, documentation and the mirror's address have no use in a running container.
rm -rf "$scratch"/rootfs/var/cache/apt/* "$scratch"/rootfs/var/lib/apt/lists/* "$scratch"/rootfs/var/log/* \
    "$scratch"/rootfs/usr/share/{doc,man,info,locale,lintian} "$scratch"/rootfs/etc/apt/sources.list
tar --create --directory "$scratch/rootfs" --numeric-owner --exclude=./dev/* . |
    docker import --message 'Debian bookworm, minimal, with libssl3' - "$image" >/dev/null
printf 'base-image: made %s (%s)\n' "$image" "$(docker image inspect --format '{{.Size}}' "$image" | numfmt --to=iec)"
