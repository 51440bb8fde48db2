#!/bin/bash
# A real S3-protocol server for tests: Ceph's radosgw, one node, all in memory, on loopback only.
#   s3-server.sh up DIR [PORT]    prints the endpoint when it answers, in about 5 s; path-style addressing,
#                                 access key testkey, secret key testsecret
#   s3-server.sh down DIR         ends what `up DIR` started, by the process ids in DIR/run
# Needs Debian's packages radosgw ceph-mon ceph-osd ceph-common curl. What differs from Amazon S3 stands in s3-shim.ts.
set -euo pipefail
ACTION=${1:?up or down}
D=${2:?DIR}

down() {
  for f in "$D"/run/*.pid; do
    if [ -f "$f" ]; then kill "$(cat "$f")" 2>/dev/null || true; fi
  done
  for _ in $(seq 80); do
    local alive=0
    for f in "$D"/run/*.pid; do
      if [ -f "$f" ] && kill -0 "$(cat "$f")" 2>/dev/null; then alive=1; fi
    done
    [ $alive = 0 ] && break
    sleep 0.1
  done
}
if [ "$ACTION" = down ]; then down; exit 0; fi

PORT=${3:-7480}
MON_PORT=$((PORT + 9309))
mkdir -p "$D"/{mon,osd,rgw,run,log}
cat > "$D/ceph.conf" <<CONF
[global]
fsid = $(cat /proc/sys/kernel/random/uuid)
mon host = [v2:127.0.0.1:$((MON_PORT + 1)),v1:127.0.0.1:$MON_PORT]
public addr = 127.0.0.1
cluster addr = 127.0.0.1
auth cluster required = cephx
auth service required = cephx
auth client required = cephx
auth allow insecure global id reclaim = true
run dir = $D/run
admin socket = $D/run/\$name.asok
pid file = $D/run/\$name.pid
log file = $D/log/\$name.log
crash dir = $D/run
keyring = $D/keyring
osd pool default size = 1
osd pool default min size = 1
osd crush chooseleaf type = 0
osd pool default pg num = 1
osd pool default pgp num = 1
osd pool default pg autoscale mode = off
mon allow pool size one = true
mon warn on pool no redundancy = false
mon max pg per osd = 1000
[mon]
mon data = $D/mon
mon initial members = a
mon data avail crit = 1
mon data avail warn = 1
paxos propose interval = 0.05
[osd]
osd data = $D/osd
osd objectstore = memstore
memstore device bytes = 2147483648
osd fast shutdown = true
[client.rgw]
rgw data = $D/rgw
rgw frontends = beast endpoint=127.0.0.1:$PORT
rgw enable apis = s3, admin
rgw thread pool size = 64
rgw run sync thread = false
rgw enable gc threads = false
rgw enable lc threads = false
rgw enable quota threads = false
rgw enable usage log = false
rgw dynamic resharding = false
rgw override bucket index max shards = 1
rgw gc max objs = 1
rgw lc max objs = 1
CONF
export CEPH_CONF="$D/ceph.conf"
C=(-c "$D/ceph.conf")
ceph-authtool --create-keyring "$D/keyring" --gen-key -n mon. --cap mon 'allow *' >/dev/null
ceph-authtool "$D/keyring" --gen-key -n client.admin --cap mon 'allow *' --cap osd 'allow *' --cap mgr 'allow *' >/dev/null
ceph-authtool "$D/keyring" --gen-key -n client.rgw --cap mon 'allow *' --cap osd 'allow *' >/dev/null
ceph-authtool "$D/keyring" --gen-key -n osd.0 --cap mon 'allow profile osd' --cap osd 'allow *' >/dev/null
FSID=$(awk '/^fsid/{print $3}' "$D/ceph.conf")
monmaptool --create --fsid "$FSID" \
  --addv a "[v2:127.0.0.1:$((MON_PORT + 1)),v1:127.0.0.1:$MON_PORT]" "$D/monmap" >/dev/null
ceph-mon "${C[@]}" --mkfs -i a --monmap "$D/monmap" --keyring "$D/keyring"
ceph-mon "${C[@]}" -i a
OSD=$(cat /proc/sys/kernel/random/uuid)
timeout 60 ceph "${C[@]}" --connect-timeout 50 osd create "$OSD" >/dev/null
ceph-osd "${C[@]}" -i 0 --mkfs --osd-uuid "$OSD" >/dev/null 2>&1
ceph-osd "${C[@]}" -i 0 >/dev/null 2>&1
radosgw "${C[@]}" -n client.rgw --setuser root --setgroup root >/dev/null 2>&1 || true
for _ in $(seq 300); do
  if curl -s -o /dev/null "http://127.0.0.1:$PORT/"; then break; fi
  sleep 0.2
done
# It takes the server's name, and would say that the server's admin socket is there already.
radosgw-admin "${C[@]}" --admin-socket="$D/run/admin.asok" -n client.rgw user create --uid=test --display-name=test \
  --access-key=testkey --secret-key=testsecret >/dev/null
echo "http://127.0.0.1:$PORT"
