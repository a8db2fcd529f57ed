# Sourced by the other scripts, from the top of the project: sets up .venv and puts it on PATH.
#
#   sieve_setup run     what the command line needs
#   sieve_setup test    the test tools as well
#
# The environment is reused while pyproject.toml stays the same and the project stays where it is.

find_python() {
    local candidate
    for candidate in python3 python3.14 python3.13 python3.12 python3.11 python; do
        if command -v "$candidate" >/dev/null 2>&1 &&
            "$candidate" -c 'import sys; sys.exit(sys.version_info < (3, 11))' >/dev/null 2>&1; then
            echo "$candidate"
            return 0
        fi
    done
    echo "setup: Python 3.11 or later is needed, and none was found on PATH" >&2
    return 1
}

sieve_setup() {
    local extra=$1 what python stamp lock
    case $extra in
        run) what="." ;;
        test) what=".[test]" ;;
        *) echo "setup: unknown set of packages: $extra" >&2; return 2 ;;
    esac
    stamp="$PWD $(cksum <pyproject.toml)"
    lock=.venv.lock
    # Two scripts started at once must not build the same environment.
    exec 9>"$lock"
    if command -v flock >/dev/null 2>&1; then flock 9; fi
    if ! { [ -x .venv/bin/python ] && [ "$(cat ".venv/stamp-$extra" 2>/dev/null)" = "$stamp" ]; }; then
        python=$(find_python) || return 1
        # An environment that was moved, or made for another pyproject.toml, is made anew.
        if ! { [ -x .venv/bin/python ] && [ "$(cat .venv/stamp-run 2>/dev/null)" = "$stamp" ]; }; then
            rm -rf .venv
        fi
        echo "setup: preparing .venv (once; it is kept for later runs)" >&2
        if [ ! -x .venv/bin/python ]; then
            "$python" -m venv .venv || {
                echo "setup: $python -m venv failed; the venv module of Python may be packaged on its own" >&2
                return 1
            }
        fi
        .venv/bin/python -m pip install --quiet --disable-pip-version-check -e "$what" || {
            echo "setup: installing the packages named in pyproject.toml failed" >&2
            return 1
        }
        echo "$stamp" >.venv/stamp-run
        echo "$stamp" >".venv/stamp-$extra"
    fi
    exec 9>&-
    export VIRTUAL_ENV="$PWD/.venv" PATH="$PWD/.venv/bin:$PATH"
    unset PYTHONHOME PYTHONPATH
}
