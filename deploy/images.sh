#!/usr/bin/env bash
# Publishes agent and coordinator ahead of time (linux-x64) and builds their images.
#
# Usage: deploy/images.sh [BASE]
#
# BASE is the image to build on; without it the local base image is used, and made first where it is missing.
# Needs the .NET SDK, a C toolchain (clang or gcc, and zlib's headers) and a running container engine.
# Makes halfvoice-agent:local and halfvoice-coordinator:local.
set -euo pipefail

cd "$(dirname "$0")/.."
readonly local_base=halfvoice-base:bookworm
readonly base="${1:-$local_base}"

if [ "$base" = "$local_base" ]; then
    deploy/base-image.sh
fi

for project in Agent Coordinator; do
    dotnet publish "src/$project" --configuration Release --runtime linux-x64 --artifacts-path artifacts/native \
        --disable-build-servers --verbosity quiet --nologo
    image="halfvoice-${project,,}:local"
    docker build --quiet --build-arg "BASE=$base" --file "deploy/$project.Dockerfile" --tag "$image" . >/dev/null
    printf 'images: built %s (%s)\n' "$image" "$(docker image inspect --format '{{.Size}}' "$image" | numfmt --to=iec)"
done
