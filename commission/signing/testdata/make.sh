#!/bin/sh
# Makes the keys and signatures of this folder with OpenSSH 9.2p1. The keys are for these tests and open nothing.
set -e
cd "$(dirname "$0")"
rm -f ed25519* ecdsa* rsa* locked* message*.sig
ssh-keygen -q -t ed25519 -N '' -C tech@example.org -f ed25519
ssh-keygen -q -t ecdsa -b 384 -N '' -C tech@example.org -f ecdsa
ssh-keygen -q -t rsa -b 3072 -N '' -C tech@example.org -f rsa
ssh-keygen -q -t ed25519 -N 'correct horse' -C tech@example.org -f locked
printf 'bus dead, resistor cold\n' > message
for key in ed25519 ecdsa rsa; do
  ssh-keygen -q -Y sign -f $key -n chargehand < message > message.$key.sig
  ssh-keygen -q -Y sign -f $key -n chargehand -O hashalg=sha256 < message > message.$key.sha256.sig
  ssh-keygen -l -f $key.pub > $key.fingerprint
done
ssh-keygen -q -Y sign -f ed25519 -n git < message > message.namespace.sig
chmod 644 ed25519 ecdsa rsa locked
