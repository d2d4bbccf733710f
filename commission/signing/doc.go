// Package signing makes and checks the signatures under a log: OpenSSH keys, OpenSSH's file signatures (SSHSIG) and its
// list of allowed signers.
//
// Start at [Signer]: [Load] gives one from a key file, [DialAgent] from a running ssh-agent, [Generate] makes a fresh one.
// [Verify] checks an armoured signature and says which key made it; [Allowed] says whose key that is.
//
// The format is OpenSSH's PROTOCOL.sshsig. A blob is the six bytes "SSHSIG", a uint32 version 1 and five strings (uint32
// length, bytes): public key, namespace, reserved, hash algorithm, signature. What is signed is "SSHSIG", namespace,
// reserved (empty), hash algorithm and the hash of the message. The armour is base64 between two marker lines. Signatures
// are written with SHA-512 and read with SHA-256 too, in the namespace [Namespace]; nothing here ever prints a private key.
package signing

// Namespace is the SSHSIG namespace of everything this program signs: `ssh-keygen -Y verify -n chargehand` reads it.
const Namespace = "chargehand"
