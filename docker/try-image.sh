#!/usr/bin/env bash
# Runs an image that buildah holds, without a container engine, and checks what the Dockerfile promises:
#   docker/try-image.sh IMAGE
# The root file system is mounted read-only, the service is process 1 under the image's own user, and the network is the
# host's. Once without a volume, twice with one. Needs buildah, curl and util-linux.
set -euo pipefail
image=${1:?usage: docker/try-image.sh IMAGE}
# without root: a user namespace of buildah's
[ "$(id -u)" -eq 0 ] || exec buildah unshare "$0" "$@"
cd "$(dirname "$0")/.."

scratch=$(mktemp -d)
container=$(buildah from --pull-never "$image")
launcher=
finish() {
  # the launcher takes its container along
  if [ -n "$launcher" ]; then kill -KILL "$launcher" 2>/dev/null || true; fi
  buildah rm "$container" >/dev/null
  rm -rf "$scratch"
}
trap finish EXIT
root=$(buildah mount "$container")

configured() { buildah inspect --type image --format "$1" "$image"; }
user=$(configured '{{.OCIv1.Config.User}}')
folder=$(configured '{{.OCIv1.Config.WorkingDir}}')
mapfile -t environment < <(configured '{{range .OCIv1.Config.Env}}{{println .}}{{end}}' | sed '/^$/d')
mapfile -t command < <(configured '{{range .OCIv1.Config.Cmd}}{{println .}}{{end}}' | sed '/^$/d')

fail() {
  echo "FAILED: $*" >&2
  if [ -s "$scratch/log" ]; then tail -n 20 "$scratch/log" >&2; fi
  exit 1
}
ok() { echo "ok: $*"; }

# in_image VOLUME NAME=VALUE… -- COMMAND…: replaces this process; VOLUME is a folder for /data, or empty for none
in_image() {
  local volume=$1 variables=("${environment[@]}")
  shift
  while [ "$1" != -- ]; do
    variables+=("$1")
    shift
  done
  shift
  # shellcheck disable=SC2016 # expanded by the inner shells
  exec unshare --mount --pid --fork --kill-child bash -c '
    set -e
    root=$1 volume=$2 user=$3
    shift 3
    mount --bind "$root" "$root"
    if [ -n "$volume" ]; then mount --bind "$volume" "$root/data"; fi
    mount --rbind /dev "$root/dev"
    mount -t proc proc "$root/proc"
    mount -o remount,bind,ro "$root"
    exec chroot --userspec="$user" --groups= "$root" env -i "$@"
  ' - "$root" "$volume" "$user" "${variables[@]}" sh -c 'cd "$1" && shift && exec "$@"' - "$folder" "$@"
}

# start VOLUME: sets launcher, service (process id outside) and port
start() {
  local began=${EPOCHREALTIME/./}
  : >"$scratch/log"
  (in_image "$1" PORT=0 -- "${command[@]}") >"$scratch/log" 2>&1 &
  launcher=$!
  for _ in $(seq 600); do
    port=$(sed -nE 's#^gramyear listens on http://0\.0\.0\.0:([0-9]+)$#\1#p' "$scratch/log")
    [ -z "$port" ] || break
    kill -0 "$launcher" 2>/dev/null || fail 'the service ended while starting'
    sleep 0.1
  done
  [ -n "$port" ] || fail 'the service does not say that it listens'
  service=$(cat "/proc/$launcher/task/$launcher/children")
  service=${service% }
  ok "listens after $(((${EPOCHREALTIME/./} - began) / 1000)) ms"
}

# stop: SIGTERM, twice, must end the service with status 0
stop() {
  local status=0
  kill -TERM "$service"
  kill -TERM "$service" 2>/dev/null || true
  wait "$launcher" || status=$?
  launcher=
  [ "$status" -eq 0 ] || fail "exit status $status after SIGTERM"
  ok 'SIGTERM ends it with status 0'
}

# ask STATUS METHOD PATH [BODY]: prints the answer
ask() {
  local status body=()
  if [ $# -gt 3 ]; then body=(-H 'Content-Type: application/json' -d "$4"); fi
  status=$(curl -sS --max-time 60 --noproxy '*' -o "$scratch/answer" -w '%{http_code}' -X "$2" "${body[@]}" \
    "http://127.0.0.1:$port$3") || fail "$2 $3: no answer"
  [ "$status" = "$1" ] || fail "$2 $3: $status where $1 was expected: $(head -c 500 "$scratch/answer")"
  cat "$scratch/answer"
}

scenario='{"darkMatter":{"mass":"10 MeV","referenceCrossSection":"1e-37 cm^2","mediator":"heavy"},
  "crystal":{"id":"silicon"},"goal":{"kind":"events","count":3,"window":{"from":2,"to":6}}}'
table='{"name":"two by two","cellMass":"52.32 GeV","bandGap":"1 eV","energyPerPair":"3 eV",
  "momentum":{"unit":"keV","edges":[1,2,3]},"energy":{"unit":"eV","edges":[1,2,3]},"formFactorSquared":[[0.1,0.2],[0.3,0.4]]}'

answers() {
  local exposure
  ask 200 GET /healthz >/dev/null
  ask 200 GET /readyz >/dev/null
  ask 200 GET /openapi.json >/dev/null
  ask 200 GET /docs >/dev/null
  ask 200 POST /v1/rates "$scenario" >"$scratch/rates"
  exposure=$(sed -nE 's/.*"needed":\{"value":([0-9.e+-]+),"unit":"kg yr".*/\1/p' "$scratch/rates")
  [ -n "$exposure" ] || fail "no exposure in $(head -c 500 "$scratch/rates")"
  ok "answers; silicon needs $exposure kg yr"
}

health_check() { (in_image '' PORT="$1" -- node docker/health-check.mjs) 2>&1; }

# --- the image as such
case $user in
  '' | 0 | 0:* | root*) fail "it runs as root ($user)" ;;
esac
[ -z "$(find "$root/app" ! -type l \( -uid "${user%%:*}" -o -perm -o+w \) -print -quit)" ] || fail "$user may write into /app"
ok "user $user, who may write nothing in /app"

(in_image '' -- node -e '
  const { existsSync, readFileSync } = require("node:fs");
  const lock = Object.entries(JSON.parse(readFileSync(0, "utf8")).packages).filter(([place]) => place !== "");
  const wrong = lock.filter(([place, { dev, devOptional, optional }]) =>
    dev ? existsSync(place) : !devOptional && !optional && !existsSync(place));
  for (const [place, { dev }] of wrong) console.error(`${dev ? "for development only" : "missing"}: ${place}`);
  process.exit(wrong.length > 0 ? 1 : 0);
') <package-lock.json || fail 'its packages are not those of production'
ok 'packages: those of production, none for development'
echo "size: $(buildah images --format '{{.Size}}' "$image"), of which /app $(du -sm "$root/app" | cut -f1) MB," \
  "node_modules $(du -sm "$root/app/node_modules" | cut -f1) MB; node $( (in_image '' -- node --version))"

echo '# read-only, without a volume'
start ''
grep -q '^NSpid:.*[[:space:]]1$' "/proc/$service/status" || fail 'the service is not process 1'
case $(readlink "/proc/$service/exe") in
  */node) ok 'node itself is process 1' ;;
  *) fail "process 1 is $(readlink "/proc/$service/exe")" ;;
esac
answers
ask 507 POST /v1/crystals "$table" >"$scratch/refusal"
ok "an upload is refused: $(cat "$scratch/refusal")"
ask 200 POST /v1/rates "$scenario" | cmp - "$scratch/rates" || fail 'another answer after the refused upload'
health_check "$port" || fail 'the health check fails on a healthy service'
stop
if health_check "$port" >"$scratch/unhealthy"; then fail 'the health check passes without a service'; fi
ok "health check: passes on the service; without it: $(cat "$scratch/unhealthy")"

echo '# read-only, with a volume'
mkdir "$scratch/data"
chown "$user" "$scratch/data"
chmod 711 "$scratch"
start "$scratch/data"
answers
ask 201 POST /v1/crystals "$table" >"$scratch/description"
ask 200 POST /v1/crystals "$table" | cmp - "$scratch/description" || fail 'the same table is described in two ways'
id=$(sed -nE 's/.*"id":"([0-9a-f]{64})".*/\1/p' "$scratch/description")
[ -n "$id" ] || fail "no id in $(cat "$scratch/description")"
ok "stores a table: $id"
stop
start "$scratch/data"
ask 200 GET "/v1/crystals/$id" | cmp - "$scratch/description" || fail 'the stored table is described differently after a restart'
ok 'the table is there after a restart'
ask 204 DELETE "/v1/crystals/$id"
ask 404 GET "/v1/crystals/$id" >/dev/null
stop
echo "$image does what docker/Dockerfile says"
