# Sourced: starts a PostgreSQL of its own in a temporary folder and names it in
# TITRANT_LEDGER_TEST_DATABASE_URL, unless that is set already.
if [ -z "${TITRANT_LEDGER_TEST_DATABASE_URL:-}" ]; then
  pg_bin=$(ls -d /usr/lib/postgresql/*/bin | sort -V | tail -1)
  pg_home=$(mktemp -d -t ledger-pg.XXXXXX)
  pg_port=$((20000 + RANDOM % 20000))
  if [ "$(id -u)" = 0 ]; then
    chown postgres "$pg_home"
    as_pg() { runuser -u postgres -- "$@"; }
  else
    as_pg() { "$@"; }
  fi
  as_pg "$pg_bin/initdb" -D "$pg_home/data" -A trust -U ledger -E UTF8 --no-sync >/dev/null
  as_pg "$pg_bin/pg_ctl" -D "$pg_home/data" -l "$pg_home/log" -w -s \
    -o "-p $pg_port -k $pg_home -c listen_addresses=127.0.0.1 -c fsync=off -c max_connections=200" start
  stop_pg() { as_pg "$pg_bin/pg_ctl" -D "$pg_home/data" -m immediate -s stop || true; rm -rf "$pg_home"; }
  trap stop_pg EXIT
  export TITRANT_LEDGER_TEST_DATABASE_URL="postgresql://ledger@127.0.0.1:$pg_port/postgres"
fi
