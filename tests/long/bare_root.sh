#!/bin/bash
# Proves the two commands on a bare Debian 12: a fresh clone, ./run, ./check, once as root and once as a created user
# with sudo, each in a root of its own made by debootstrap; then both again without a network.
#
#   tests/long/bare_root.sh [FOLDER]     FOLDER: where the roots are made (default $TMPDIR or /var/tmp; 6 GB free)
#
# Needs root, debootstrap, git and the machine's own apt sources for Debian 12: the mirror, the proxy and whatever else
# apt is told there is taken from them. Takes about as long as four times ./check. Prints times and package counts.
set -euo pipefail

release=bookworm
tree=$(cd "$(dirname "${BASH_SOURCE[0]}")/../.." && pwd)

if [ "$(id -u)" -ne 0 ] || ! command -v debootstrap >/dev/null; then
  echo "This needs root and the package debootstrap." >&2
  exit 3
fi
# In a mount namespace of its own, so that no mount outlives this script.
if [ -z "${BARE_ROOT_APART-}" ]; then
  export BARE_ROOT_APART=1
  exec unshare --mount --propagation private "$0" "$@"
fi

folder=$(mktemp -d "${1:-${TMPDIR:-/var/tmp}}/bare-root.XXXXXX")
leave() {
  status=$?
  # The roots hold mounts of /proc and the like: these go first, and nothing on another file system is ever removed.
  awk -v folder="$folder/" 'index($2, folder) == 1 { print $2 }' /proc/self/mounts | sort -r | xargs -r -n 1 umount
  rm -rf --one-file-system "$folder"
  exit "$status"
}
trap leave EXIT
trap 'exit 130' INT TERM

# --- the machine's apt configuration ---
# As apt itself reads it, whichever of its formats it is written in: "URI SUITE COMPONENT" of each Debian source.
sources=$(apt-get indextargets --format '$(REPO_URI) $(RELEASE) $(COMPONENT)' 'Created-By: Packages' |
  awk -v release="$release" '$3 == "main" && ($2 == release || $2 == release "-updates" || $2 == release "-security")' |
  sort -u)
mirror=$(awk -v release="$release" '$2 == release { print $1; exit }' <<<"$sources")
if [ -z "$mirror" ]; then
  echo "apt on this machine has no source for $release main; add one, then start again." >&2
  exit 3
fi
# Keys that the machine trusts beyond Debian's own, for a mirror that signs by itself.
keyring="$folder/keys.gpg"
cat /usr/share/keyrings/debian-archive-keyring.gpg /etc/apt/trusted.gpg.d/*.gpg >"$keyring" 2>/dev/null || true
options=()
[ -s "$keyring" ] && options+=(--keyring "$keyring")

# take_settings ROOT: what apt and the resolver need to work in there as they do out here.
take_settings() {
  local root=$1
  awk '{ print "deb", $1, $2, $3 }' <<<"$sources" >"$root/etc/apt/sources.list"
  apt-config dump | grep -E '^Acquire::(http|https|ftp|Retries|Check-|ForceIPv)' >"$root/etc/apt/apt.conf.d/90machine" || true
  cp /etc/apt/trusted.gpg.d/*.gpg /etc/apt/trusted.gpg.d/*.asc "$root/etc/apt/trusted.gpg.d/" 2>/dev/null || true
  cp -L /etc/resolv.conf /etc/hosts "$root/etc/"
  if [ -f /etc/ssl/certs/ca-certificates.crt ]; then
    mkdir -p "$root/etc/ssl/certs"
    cp -L /etc/ssl/certs/ca-certificates.crt "$root/etc/ssl/certs/"
  fi
}

# In a mount namespace whose root it is, as on a machine of its own: in a mere chroot no user may make a namespace, and
# tests that do would fail there alone.
enter='
root=$1 user=$2 command=$3
mount --bind "$root" "$root" && cd "$root" && mkdir -p old && pivot_root . old || exit 3
mount -t proc proc proc
mkdir -p dev/pts dev/shm
mount -t devpts -o newinstance,ptmxmode=0666,mode=620 devpts dev/pts
ln -sf pts/ptmx dev/ptmx
mount -t tmpfs -o mode=1777 shm dev/shm
umount --lazy old
exec chroot . su -w http_proxy,https_proxy,no_proxy,LANG - "$user" -c "$command"
'
export enter

# inside ROOT USER COMMAND: as at a fresh login, with nothing of the caller's environment but a proxy.
inside() {
  local root=$1 user=$2 command=$3
  env -i PATH=/usr/local/sbin:/usr/local/bin:/usr/sbin:/usr/bin:/sbin:/bin ${http_proxy:+http_proxy="$http_proxy"} \
    ${https_proxy:+https_proxy="$https_proxy"} ${no_proxy:+no_proxy="$no_proxy"} LANG=C.UTF-8 \
    unshare --mount --propagation private sh -c "$enter" sh "$root" "$user" "$command"
}
without_network() { unshare --net "$@"; }
export -f inside

packages() { chroot "$1" dpkg-query -W -f '${db:Status-Status}\n' | grep -c '^installed$'; }

# timed WHAT COMMAND…: its output indented, its last line and time kept for the end.
results=()
timed() {
  local what=$1 started=$SECONDS status=0
  shift
  echo "== $what"
  "$@" >"$folder/output" 2>&1 </dev/null || status=$?
  sed 's/^/   /' "$folder/output"
  results+=("$(printf '%-46s %5d s   status %d   %s' "$what" $((SECONDS - started)) "$status" "$(tail -n 1 "$folder/output")")")
  [ "$status" -eq 0 ] || worst=1
}
worst=0

# --- the pristine root and the clone's origin ---
started=$SECONDS
echo "== debootstrap --variant=minbase $release"
debootstrap --variant=minbase "${options[@]}" "$release" "$folder/pristine" "$mirror" >"$folder/output" 2>&1 ||
  { cat "$folder/output"; exit 3; }
take_settings "$folder/pristine"
results+=("$(printf '%-46s %5d s   %d packages' debootstrap $((SECONDS - started)) "$(packages "$folder/pristine")")")
# One file, which any user in there can read; a repository that belongs to someone else would be refused.
git -C "$tree" bundle create --quiet "$folder/origin.bundle" HEAD $(git -C "$tree" symbolic-ref -q HEAD)
if [ -n "$(git -C "$tree" status --porcelain)" ]; then
  echo "(what is tested is the last commit; the work tree differs from it)"
fi

for who in root maker; do
  root="$folder/$who"
  cp -a "$folder/pristine" "$root"
  cp "$folder/origin.bundle" "$root/var/origin.bundle"
  tools=git
  if [ "$who" != root ]; then
    tools="git sudo"
  fi
  timed "$who: installing $tools" inside "$root" root \
    "apt-get update -q && DEBIAN_FRONTEND=noninteractive apt-get install -q -y --no-install-recommends $tools"
  if [ "$who" != root ]; then
    chroot "$root" useradd --create-home --shell /bin/bash "$who"
    echo "$who ALL=(ALL) NOPASSWD: ALL" >"$root/etc/sudoers.d/$who"
    chmod 440 "$root/etc/sudoers.d/$who"
  fi
  before=$(packages "$root")
  timed "$who: clone" inside "$root" "$who" "git clone --quiet /var/origin.bundle unsoldered"
  timed "$who: ./run" inside "$root" "$who" "cd unsoldered && ./run"
  after_run=$(packages "$root")
  timed "$who: ./check" inside "$root" "$who" "cd unsoldered && ./check"
  results+=("$who: packages $before with $tools, $after_run after ./run, $(packages "$root") after ./check")
  timed "$who: ./run without network" without_network bash -c 'inside "$@"' - "$root" "$who" "cd unsoldered && ./run"
  timed "$who: ./check --quick without network" without_network bash -c 'inside "$@"' - "$root" "$who" \
    "cd unsoldered && ./check --quick"
  timed "$who: the clone is clean" inside "$root" "$who" "cd unsoldered && test -z \"\$(git status --porcelain)\""
done

echo
printf '%s\n' "${results[@]}"
exit "$worst"
