# shellcheck shell=bash
# What the commands in this folder share: finding a Python, making <root>/.venv from the lock files,
# and saying in one line what went wrong. Sourced, never run; keeps to the bash 3.2 that macOS has.

unset CDPATH PYTHONHOME PYTHONPATH PIP_USER PIP_TARGET PIP_PREFIX PIP_REQUIRE_VIRTUALENV
root=$(cd "$(dirname "${BASH_SOURCE[0]}")/.." && pwd -P)
venv=$root/.venv
cache=$root/.cache
lock_files=(deploy/requirements.txt deploy/requirements-build.txt deploy/requirements-test.txt deploy/requirements-spark.txt)
oldest_minor=11

say() { printf '%s\n' "$*"; }

die() {
  printf 'deploy/%s: %s\n' "$(basename "$0")" "$*" >&2
  exit 1
}

# Prints "MAJOR MINOR yes|no": the version, and whether it can make virtual environments (Debian
# ships the venv module without ensurepip, which a package of its own brings). Prints nothing where
# the name is not a Python at all; runs under Python 2 as well, so that an old one can say it is old.
ask_python() {
  "$1" -c '
import sys
try:
    import ensurepip, venv
    able = "yes"
except ImportError:
    able = "no"
print("%d %d %s" % (sys.version_info[0], sys.version_info[1], able))' 2>/dev/null || true
}

# Sets base_python to the first Python that will do; PYTHON in the environment names the only candidate.
find_python() {
  local candidate major minor able too_old="" no_venv="" candidates
  candidates=(python3 python3.14 python3.13 python3.12 python3.11)
  if [ -n "${PYTHON:-}" ]; then
    command -v "$PYTHON" >/dev/null 2>&1 || die "PYTHON is '$PYTHON', which is no command: set it to the path of a Python 3.$oldest_minor or later, or unset it"
    candidates=("$PYTHON")
  fi
  for candidate in "${candidates[@]}"; do
    command -v "$candidate" >/dev/null 2>&1 || continue
    read -r major minor able <<<"$(ask_python "$candidate" | tr '.' ' ')"
    [ -n "${minor:-}" ] || continue
    if [ "$major" -lt 3 ] || { [ "$major" -eq 3 ] && [ "$minor" -lt "$oldest_minor" ]; }; then
      too_old=${too_old:-"$candidate is $major.$minor"}
    elif [ "$able" != yes ]; then
      no_venv=${no_venv:-"$candidate (Python $major.$minor) has no venv module: install Debian's package python$major.$minor-venv (as root: apt-get install -y python$major.$minor-venv)"}
    else
      base_python=$candidate
      return
    fi
  done
  [ -z "$no_venv" ] || die "$no_venv or set PYTHON to another Python"
  die "Python 3.$oldest_minor or later is needed${too_old:+ and $too_old}: install one (Debian: python3 and python3-venv) or set PYTHON to its path"
}

# Two digests: of what decides which packages belong in the environment, and of what decides how the
# project itself is installed into it. Either changes, and that part is made anew.
digests() {
  "$base_python" - "$root" "${lock_files[@]}" <<'PYTHON'
import hashlib
import pathlib
import sys

root, *locks = sys.argv[1:]
packages = hashlib.sha256(f"{sys.version}\0{sys.base_prefix}\0{root}".encode())
for name in locks:
    packages.update(pathlib.Path(root, name).read_bytes())
project = hashlib.sha256(pathlib.Path(root, "pyproject.toml").read_bytes())
print(packages.hexdigest(), project.hexdigest())
PYTHON
}

pip_says_no_network='NewConnectionError|ConnectTimeoutError|ConnectionRefused|Connection refused|name resolution|nodename nor servname|Network is unreachable|No route to host|Max retries exceeded|ReadTimeout|ProxyError|Read timed out|from versions: none'

# Runs the environment's pip quietly; what it said stays in a log, and its reason comes out in one line.
run_pip() {
  local log=$venv/install.log
  if ! "$venv/bin/python" -m pip --quiet --disable-pip-version-check --no-input install \
    --retries "${PIP_RETRIES:-2}" "$@" >"$log" 2>&1; then
    if grep -qE "$pip_says_no_network" "$log"; then
      die "no network: the packages in deploy/requirements*.txt could not be fetched; connect (or set PIP_INDEX_URL or a proxy) and run this again"
    fi
    die "pip could not install: $(grep -E '^ *ERROR' "$log" | tail -n 1) (all of it in $log)"
  fi
}

install_locked() { # names of lock files
  local options=() name
  for name in "$@"; do options+=(-r "$root/$name"); done
  # Wheels alone: building a source archive would fetch build tools that no lock file names.
  run_pip --require-hashes --only-binary :all: "${options[@]}"
}

# Spark comes as a source archive alone; the setuptools that builds it is the locked one.
install_spark() {
  run_pip --require-hashes --no-deps --only-binary :all: --no-binary pyspark --no-build-isolation \
    -r "$root/deploy/requirements-spark.txt"
}

# The higher of two levels, so that what is there for one command is kept by another that needs less.
higher_level() {
  case " $1 $2 " in
    *" full "*) say full ;;
    *" test "*) say test ;;
    *) say run ;;
  esac
}

refresh_environment() { # level: run, test or full (test, and Spark)
  local wanted=$1 packages project had_packages="" had_level="" had_project="" stamp=$venv/stamp level
  read -r packages project <<<"$(digests)"
  [ ! -f "$stamp" ] || read -r had_packages had_level had_project <"$stamp"
  level=$wanted
  if [ "$had_packages" = "$packages" ] && [ -x "$venv/bin/python" ]; then
    level=$(higher_level "$wanted" "$had_level")
    [ "$had_level $had_project" != "$level $project" ] || return 0
  else
    say "Making .venv with $("$base_python" --version 2>&1) and installing the locked packages (once, about a minute)"
    had_level=""
    "$base_python" -m venv --clear "$venv" || die "$base_python could not make a virtual environment in $venv"
  fi
  rm -f "$stamp"
  if [ "$had_level" != "$level" ]; then
    case $level in
      run) install_locked deploy/requirements.txt deploy/requirements-build.txt ;;
      *) install_locked deploy/requirements-test.txt ;;
    esac
    [ "$level" != full ] || install_spark
  fi
  run_pip --no-deps --no-build-isolation -e "$root"
  printf '%s %s %s\n' "$packages" "$level" "$project" >"$stamp"
}

# Makes .venv fit for a level ("run", "test" or "full"), one command at a time where flock is to be had.
ensure_environment() {
  find_python
  mkdir -p "$cache"
  (
    ! command -v flock >/dev/null 2>&1 || flock 9
    refresh_environment "$1"
  ) 9>"$cache/setup.lock"
}
