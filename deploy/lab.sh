#!/usr/bin/env bash
# Packs a plan into deploy/lab, where docker-compose.yml takes the bundles from.
#
# Usage: deploy/lab.sh [PLAN]        (without PLAN: the demo, whose sites docker-compose.yml lists)
#
# Replaces an earlier deploy/lab and with it every certificate and key. The containers run as user 10001, and a bundle
# holds private keys with mode 0600, so the bundles are handed over to that user: directly when this script runs as
# root, through a short-lived container when it does not.
set -euo pipefail

cd "$(dirname "$0")/.."
readonly plan="${1:-deploy/plans/sallow-reach}"

as_root() {
    if [ "$(id -u)" -eq 0 ]; then
        "$@"
    else
        docker run --rm --network none --user 0:0 --volume "$PWD/deploy:$PWD/deploy" --workdir "$PWD" \
            --entrypoint "$1" halfvoice-agent:local "${@:2}"
    fi
}

if [ -e deploy/lab ]; then
    as_root rm -rf deploy/lab
fi
dotnet run --project src/Rig --configuration Release -- pack "$plan" deploy/lab --coordinator coordinator:7443
as_root chown -R 10001:10001 deploy/lab
printf 'lab: deploy/lab is ready; start it with docker-compose up (or docker compose up)\n'
