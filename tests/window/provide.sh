#!/usr/bin/env bash
# Provides a windowed build of the 3D suite in the folder ROOT, from Debian's own packages, for the tests in this folder:
#     sudo tests/window/provide.sh ROOT && sudo FLUXFACE_WINDOW_HOST=ROOT python3 tests/run.py
# About a minute and 1.8 GB. What is there already is kept.
set -euo pipefail
root=${1:?a folder to put it in}
export DEBIAN_FRONTEND=noninteractive
if [[ ! -x $root/usr/bin/blender ]]; then
  command -v debootstrap >/dev/null || { apt-get update -qq && apt-get install -y -qq debootstrap >/dev/null; }
  mirror=$(grep -rhoP '(?<=URIs: )\S+|(?<=^deb )\S+' /etc/apt/sources.list.d/*.sources /etc/apt/sources.list 2>/dev/null | head -n 1 || true)
  [[ -n $mirror ]] || { echo "no Debian mirror is configured here" >&2; exit 1; }
  debootstrap --variant=minbase --include=ca-certificates trixie "$root" "$mirror" >/dev/null
  cp /etc/resolv.conf "$root/etc/resolv.conf"
  chroot "$root" apt-get update -qq
  chroot "$root" apt-get install -y -qq --no-install-recommends \
    blender xvfb xauth libgl1-mesa-dri imagemagick python3-numpy >/dev/null
fi
mountpoint -q "$root/proc" || mount -t proc proc "$root/proc"
mountpoint -q "$root/dev" || mount --bind /dev "$root/dev"
