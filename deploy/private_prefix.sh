# shellcheck shell=bash
# Sourced by setup: a prefix of Debian 13 packages (PostgreSQL 17, TimescaleDB
# and the libraries they need, libc included) for Debian machines that have no
# such packages. Nothing of the system is changed; apt works here with a
# configuration and lists of its own, and checks the archive's signature with
# the machine's debian-archive-keyring. The mirror is the one that the machine's
# own sources name.
#
# The programs are given their interpreter and library path as absolute paths,
# so the prefix is built where it stays, behind a lock. The file `complete` is
# written last; a prefix without it is built anew.

prefix_suite=trixie
prefix_packages=(postgresql-17 postgresql-client-17 postgresql-17-timescaledb)
prefix_keyring=/usr/share/keyrings/debian-archive-keyring.gpg
prefix_form=1 # of the prefix: another number here builds it anew

prefix_folder() {
	if [ "$(id -u)" = 0 ]; then
		echo /var/cache/thawledger/pg17
	else
		echo "${XDG_CACHE_HOME:-$HOME/.cache}/thawledger/pg17"
	fi
}

prefix_is_complete() { [ "$(head -n 1 "$1/complete" 2>/dev/null)" = "form $prefix_form" ]; }

# prefix_found prints the bin folder of a complete prefix, the machine's first.
prefix_found() {
	local dir
	for dir in /var/cache/thawledger/pg17 "$(prefix_folder)"; do
		if prefix_is_complete "$dir"; then
			printf '%s\n' "$dir/usr/lib/postgresql/17/bin"
			return
		fi
	done
}

# prefix_mirror prints the first address from which the machine takes a Debian
# release, out of one-line and stanza sources. Whether it really is Debian's is
# for the signature to say.
prefix_mirror() {
	local file
	for file in /etc/apt/sources.list /etc/apt/sources.list.d/*.list; do
		[ -r "$file" ] || continue
		sed -e 's/#.*//' -e 's/\[[^]]*\]//' "$file" | awk '$1 == "deb" { print $2, $3 }'
	done | prefix_debian_only
	for file in /etc/apt/sources.list.d/*.sources; do
		[ -r "$file" ] || continue
		grep -v '^#' "$file" | awk -v RS= -F'\n' '{
			delete value
			for (i = 1; i <= NF; i++) {
				line = $i
				if (line ~ /^[^ \t]/) {
					name = tolower(line); sub(/:.*/, "", name)
					sub(/^[^:]*:/, "", line)
				}
				value[name] = value[name] " " line
			}
			if ((" " value["types"] " ") !~ /[ \t]deb[ \t]/ || tolower(value["enabled"]) ~ /no|false/) next
			uris = split(value["uris"], uri, /[ \t]+/)
			suites = split(value["suites"], suite, /[ \t]+/)
			for (u = 1; u <= uris; u++) for (s = 1; s <= suites; s++)
				if (uri[u] != "" && suite[s] != "") print uri[u], suite[s]
		}'
	done | prefix_debian_only
}

prefix_debian_only() {
	awk '$1 !~ /^cdrom:/ && $2 ~ /^(bullseye|bookworm|trixie|forky|sid|stable|oldstable|oldoldstable|testing|unstable)$/ { print $1 }'
}

# prefix_closure reads `apt-cache depends --recurse` and prints the packages
# named as arguments and all libraries that they need. libLLVM stays out: the
# server runs with jit=off.
prefix_closure() {
	awk -v wanted="$*" '
		/^[^ ]/ { of = $1; next }
		/^ [ |](Pre)?Depends: [^<]/ { needs[of] = needs[of] " " $NF }
		END {
			n = split(wanted, queue, " ")
			for (i = 1; i <= n; i++) seen[queue[i]] = 1
			for (i = 1; i <= n; i++) {
				print queue[i]
				m = split(needs[queue[i]], need, " ")
				for (j = 1; j <= m; j++)
					if (need[j] ~ /^z?lib/ && need[j] !~ /^libllvm/ && !seen[need[j]]++) queue[++n] = need[j]
			}
		}'
}

# prefix_build builds the prefix, unless another process has done so meanwhile.
prefix_build() {
	local dir mirror began=$SECONDS
	dir=$(prefix_folder)
	mirror=$(prefix_mirror | head -n 1)
	if [ -z "$mirror" ]; then
		say "no TimescaleDB: the distribution has none, and its package sources name no Debian mirror to take that of Debian 13 from"
		return 1
	fi
	local tool
	for tool in apt-get apt-cache dpkg flock gpgv; do
		if ! command -v "$tool" >/dev/null; then
			say "no TimescaleDB: taking it from Debian 13 needs the command $tool"
			return 1
		fi
	done
	if [ ! -r "$prefix_keyring" ]; then
		say "no TimescaleDB: taking it from Debian 13 needs the package debian-archive-keyring"
		return 1
	fi
	# The server reads time zones from the system, whatever its prefix.
	if [ ! -e /usr/share/zoneinfo/UTC ] && ! { can_be_root && install_or_refresh tzdata; }; then
		say "no TimescaleDB: a server from Debian 13 needs the package tzdata"
		return 1
	fi
	mkdir -p "${dir%/*}" || return
	(
		flock 9
		if ! prefix_is_complete "$dir"; then
			say "getting PostgreSQL 17 with TimescaleDB from Debian 13 into $dir (about 50 MB to load)"
			rm -rf "$dir" && mkdir -p "$dir/build" || exit 1
			if ! prefix_fill "$dir" "$mirror" >"$dir/build/log" 2>&1; then
				prefix_explain "$dir/build/log"
				exit 1
			fi
			say "built in $((SECONDS - began)) s"
		fi
	) 9>"$dir.lock"
}

prefix_explain() {
	if grep -q -e NO_PUBKEY -e 'is not signed' "$1"; then
		say "no TimescaleDB: the machine's debian-archive-keyring is too old to check the signature of Debian 13; upgrade that package and run this again"
		return
	fi
	say "no TimescaleDB: taking it from Debian 13 failed; the end of $1 says:"
	tail -n 8 "$1" >&2
}

# prefix_fill does the work. It is called where `set -e` has no effect, hence
# the many `|| return`.
prefix_fill() {
	local dir=$1 mirror=$2 build=$1/build package packages program
	local apt=(-q -c "$build/apt.conf")
	mkdir -p "$build"/{lists/partial,archives/partial,sources,debs} || return
	: >"$build/status" || return
	cat >"$build/sources/debian13.sources" <<-END || return
		Types: deb
		URIs: $mirror
		Suites: $prefix_suite
		Components: main
		Architectures: $(dpkg --print-architecture)
		Targets: Packages
		Signed-By: $prefix_keyring
	END
	cat >"$build/apt.conf" <<-END || return
		Dir::State "$build";
		Dir::State::status "$build/status";
		Dir::Cache "$build";
		Dir::Etc::sourcelist "/dev/null";
		Dir::Etc::sourceparts "$build/sources";
		Dir::Etc::preferences "/dev/null";
		Dir::Etc::preferencesparts "/dev/null";
		APT::Update::Error-Mode "any";
		Acquire::Retries "3";
		#clear APT::Update::Pre-Invoke;
		#clear APT::Update::Post-Invoke;
		#clear APT::Update::Post-Invoke-Success;
	END
	if [ "$(id -u)" = 0 ] && id _apt >/dev/null 2>&1; then
		chown _apt "$build/debs" || return # apt loads as this account
	fi
	apt-get "${apt[@]}" update || return
	packages=$(apt-cache "${apt[@]}" depends --recurse --no-recommends --no-suggests --no-conflicts \
		--no-breaks --no-replaces --no-enhances "${prefix_packages[@]}" patchelf |
		prefix_closure "${prefix_packages[@]}" patchelf) || return
	# shellcheck disable=SC2086 # one word a package
	(cd "$build/debs" && apt-get "${apt[@]}" download $packages) || return
	for package in "$build"/debs/*.deb; do
		dpkg -x "$package" "$dir" || return
	done

	local bin=$dir/usr/lib/postgresql/17/bin libc loader
	libc=$(find "$dir/usr/lib" -name libc.so.6) || return
	loader=$(find "${libc%/*}" -maxdepth 1 -name 'ld-linux*.so.*') || return
	if [ ! -e "$libc" ] || [ ! -x "$loader" ]; then
		echo "not exactly one libc and one loader in $dir: ${libc:-none}, ${loader:-none}"
		return 1
	fi
	rm -rf "$dir/usr/lib/postgresql/17/lib/"{llvmjit*,bitcode} \
		"$dir"/usr/share/{doc,man,info,lintian,locale,bash-completion} || return
	# A forced RPATH of the program also holds for the libraries it loads, so the
	# libraries themselves stay as they are.
	for program in "$bin"/*; do
		"$loader" --library-path "${libc%/*}" "$dir/usr/bin/patchelf" \
			--set-interpreter "$loader" --force-rpath --set-rpath "${libc%/*}" "$program" || return
	done
	prefix_check "$dir" "$bin" "$loader" || return
	"$bin/postgres" --version || return
	{
		echo "form $prefix_form"
		(cd "$build/debs" && printf '%s\n' *.deb)
	} >"$build/complete" || return
	mv "$build/complete" "$dir/complete" && rm -rf "$build"
}

# prefix_check fails if anything would be taken from outside the prefix.
prefix_check() {
	local dir=$1 bin=$2 loader=$3 object strays
	for object in "$bin"/{postgres,initdb,psql,pg_isready,pg_dump} "${bin%/bin}"/lib/*.so; do
		strays=$("$loader" --library-path "${loader%/*}" --list "$object" |
			awk -v dir="$dir/" '/not found/ || (/=> \// && index($3, dir) != 1)')
		if [ -n "$strays" ]; then
			printf '%s needs what the prefix lacks:\n%s\n' "$object" "$strays"
			return 1
		fi
	done
}
