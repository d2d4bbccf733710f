package signing

import (
	"bytes"
	"fmt"
	"strings"

	"golang.org/x/crypto/ssh"
)

// PublicKey is an OpenSSH public key. The zero value is no key.
type PublicKey struct{ key ssh.PublicKey }

// ParsePublicKey reads one line as a .pub file has it: type, base64, comment.
func ParsePublicKey(line string) (PublicKey, error) {
	key, _, options, rest, err := ssh.ParseAuthorizedKey([]byte(line))
	if err != nil || len(options) > 0 || len(bytes.TrimSpace(rest)) > 0 {
		return PublicKey{}, fmt.Errorf("%.60q is no OpenSSH public key: wanted a line such as \"ssh-ed25519 AAAA… comment\"", line)
	}
	return PublicKey{key}, nil
}

// IsValid tells whether there is a key.
func (k PublicKey) IsValid() bool { return k.key != nil }

// Fingerprint is "SHA256:" and the unpadded base64 of the key's SHA-256, as `ssh-keygen -l` prints it.
func (k PublicKey) Fingerprint() string {
	if k.key == nil {
		return "invalid PublicKey"
	}
	return ssh.FingerprintSHA256(k.key)
}

// String is the fingerprint.
func (k PublicKey) String() string { return k.Fingerprint() }

// AuthorizedKey is type and base64 in one line without its line feed, as it stands in a list of allowed signers.
func (k PublicKey) AuthorizedKey() string {
	if k.key == nil {
		return "invalid PublicKey"
	}
	return strings.TrimSuffix(string(ssh.MarshalAuthorizedKey(k.key)), "\n")
}

// Equal tells whether both are the same key.
func (k PublicKey) Equal(other PublicKey) bool {
	return k.key != nil && other.key != nil && bytes.Equal(k.key.Marshal(), other.key.Marshal())
}
