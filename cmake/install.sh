#!/bin/sh
# Installs what is missing of the Debian packages in packages.txt. usage: install.sh build|test ...
set -eu
here=$(dirname "$0")
missing=
for kind in "$@"; do
    packages=$(sed -n "s/^$kind //p" "$here/packages.txt")
    for package in $packages; do
        dpkg-query -W -f '${Status}' "$package" 2>/dev/null | grep -q 'ok installed' || missing="$missing $package"
    done
done
[ -n "$missing" ] || exit 0
echo "installing:$missing"
as_root=
[ "$(id -u)" = 0 ] || as_root=sudo
$as_root apt-get update -q
# shellcheck disable=SC2086 # the list is meant to be split
$as_root env DEBIAN_FRONTEND=noninteractive apt-get install -y -q --no-install-recommends $missing
