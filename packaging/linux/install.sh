#!/bin/sh
# Install Spin Ledger from this folder; no network is needed.
#
#   ./install.sh              for you alone, into ~/.local
#   ./install.sh /usr/local   for everybody (as root)
#   ./install.sh --remove [PREFIX]
set -eu

here=$(cd "$(dirname "$0")" && pwd)
remove=no
[ "${1:-}" = --remove ] && { remove=yes; shift; }
prefix=${1:-"$HOME/.local"}
programs="$prefix/lib/spinledger"
share="$prefix/share"

take_away() {
    rm -rf "$programs"
    rm -f "$prefix/bin/spinledger" "$prefix/bin/spinledger-bench" \
        "$share/applications/spinledger.desktop" \
        "$share/mime/packages/spinledger-mime.xml" \
        "$share/icons/hicolor/scalable/apps/spinledger.svg"
}

refresh() {
    # Desktops without these tools pick the files up at the next login.
    command -v update-mime-database >/dev/null && update-mime-database "$share/mime" || true
    command -v update-desktop-database >/dev/null && update-desktop-database "$share/applications" || true
}

take_away
if [ "$remove" = no ]; then
    mkdir -p "$prefix/bin" "$prefix/lib" "$share/applications" "$share/mime/packages" \
        "$share/icons/hicolor/scalable/apps"
    cp -R "$here/spinledger" "$programs"
    ln -s "$programs/spinledger" "$prefix/bin/spinledger"
    ln -s "$programs/spinledger-bench" "$prefix/bin/spinledger-bench"
    sed "s|^Exec=spinledger-bench|Exec=\"$prefix/bin/spinledger-bench\"|" \
        "$here/linux/spinledger.desktop" >"$share/applications/spinledger.desktop"
    cp "$here/linux/spinledger-mime.xml" "$share/mime/packages/"
    cp "$here/linux/spinledger.svg" "$share/icons/hicolor/scalable/apps/"
    refresh
    echo "Installed in $programs; start it with $prefix/bin/spinledger-bench"
else
    refresh
    echo "Removed from $prefix"
fi
