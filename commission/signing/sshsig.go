package signing

import (
	"bytes"
	"encoding/base64"
	"errors"
	"fmt"
	"hash"
	"io"
	"strings"

	"github.com/hiddeco/sshsig"
	"golang.org/x/crypto/ssh"
)

const (
	armourBegin = "-----BEGIN SSH SIGNATURE-----"
	armourEnd   = "-----END SSH SIGNATURE-----"
	armourWidth = 70 // OpenSSH's own
	// maxArmour bounds what is read as a signature; an RSA signature of 16384 bits needs about 6 KiB.
	maxArmour = 64 << 10
)

// MalformedError says why a text is no SSHSIG signature.
type MalformedError struct{ Why string }

func (e *MalformedError) Error() string { return "malformed signature: " + e.Why }

// NamespaceError says that a signature was made for something else.
type NamespaceError struct{ Got, Want string }

func (e *NamespaceError) Error() string {
	return fmt.Sprintf("the signature is for namespace %q, not %q", e.Got, e.Want)
}

// ErrMismatch says that a well-formed signature is not of this message.
var ErrMismatch = errors.New("the signature does not fit the message")

// Signature is a well-formed signature, not yet checked against any message.
type Signature struct{ inner *sshsig.Signature }

// Parse reads an armoured signature strictly: one block, nothing before or after it, even lines of base64. The namespace is
// checked too.
func Parse(armoured []byte) (*Signature, error) { return parse(armoured, Namespace) }

func parse(armoured []byte, namespace string) (*Signature, error) {
	blob, err := dearmour(armoured)
	if err != nil {
		return nil, err
	}
	inner, err := sshsig.ParseSignature(blob)
	if err != nil {
		return nil, &MalformedError{strings.TrimPrefix(err.Error(), "ssh: ")}
	}
	if _, isCertificate := inner.PublicKey.(*ssh.Certificate); isCertificate {
		return nil, &MalformedError{"it was made with a certificate; sign with a plain key"}
	}
	if len(inner.Signature.Rest) > 0 && !strings.HasPrefix(inner.PublicKey.Type(), "sk-") {
		return nil, &MalformedError{"bytes after the signature itself"}
	}
	if inner.Namespace != namespace {
		return nil, &NamespaceError{Got: inner.Namespace, Want: namespace}
	}
	return &Signature{inner}, nil
}

// NewHash gives the hash that this signature wants over the message.
func (s *Signature) NewHash() hash.Hash { return s.inner.HashAlgorithm.Hash() }

// HashAlgorithm is "sha512" or "sha256".
func (s *Signature) HashAlgorithm() string { return s.inner.HashAlgorithm.String() }

// Key is the key that made the signature, if it holds.
func (s *Signature) Key() PublicKey { return PublicKey{s.inner.PublicKey} }

// VerifyDigest checks the signature against the message's hash. It returns [ErrMismatch] or nil.
func (s *Signature) VerifyDigest(digest []byte) error {
	err := s.inner.PublicKey.Verify(signedData(s.inner.Namespace, s.inner.HashAlgorithm.String(), digest), s.inner.Signature)
	if err != nil {
		return ErrMismatch
	}
	return nil
}

// Verify checks an armoured signature of a message and gives the key that made it. Whose key that is, [Allowed] says.
func Verify(message []byte, armoured string) (PublicKey, error) {
	s, err := Parse([]byte(armoured))
	if err != nil {
		return PublicKey{}, err
	}
	h := s.NewHash()
	h.Write(message)
	if err := s.VerifyDigest(h.Sum(nil)); err != nil {
		return s.Key(), err
	}
	return s.Key(), nil
}

// signedData is what the key signs. The reserved string is empty, whatever the blob holds: OpenSSH ignores it too.
func signedData(namespace, hashAlgorithm string, digest []byte) []byte {
	return append([]byte("SSHSIG"), ssh.Marshal(struct{ Namespace, Reserved, HashAlgorithm, Hash string }{
		namespace, "", hashAlgorithm, string(digest)})...)
}

// sign makes an armoured signature of everything that r gives.
func sign(r io.Reader, key ssh.Signer) (string, error) {
	s, err := sshsig.Sign(r, key, sshsig.HashSHA512, Namespace)
	if err != nil {
		return "", fmt.Errorf("sign with %s: %w", ssh.FingerprintSHA256(key.PublicKey()), err)
	}
	return armour(s.Marshal()), nil
}

func armour(blob []byte) string {
	var b strings.Builder
	b.WriteString(armourBegin + "\n")
	text := base64.StdEncoding.EncodeToString(blob)
	for len(text) > armourWidth {
		b.WriteString(text[:armourWidth] + "\n")
		text = text[armourWidth:]
	}
	b.WriteString(text + "\n" + armourEnd + "\n")
	return b.String()
}

// dearmour takes the armour off. Lines may have any one width, as programs differ, and may all end in CR LF.
func dearmour(text []byte) ([]byte, error) {
	if len(text) > maxArmour {
		return nil, &MalformedError{fmt.Sprintf("longer than %d bytes", maxArmour)}
	}
	if bytes.Contains(text, []byte("\r\n")) {
		plain := bytes.ReplaceAll(text, []byte("\r\n"), []byte("\n"))
		if len(text)-len(plain) != bytes.Count(plain, []byte("\n")) {
			return nil, &MalformedError{"only some lines end in CR LF"}
		}
		text = plain
	}
	rest, ok := bytes.CutPrefix(text, []byte(armourBegin+"\n"))
	if !ok {
		return nil, &MalformedError{"it does not begin with " + armourBegin}
	}
	body, after, ok := bytes.Cut(rest, []byte(armourEnd))
	if !ok {
		return nil, &MalformedError{"no line " + armourEnd}
	}
	if string(after) != "\n" {
		if len(after) == 0 {
			return nil, &MalformedError{"the last line does not end"}
		}
		return nil, &MalformedError{"text after " + armourEnd}
	}
	lines := strings.SplitAfter(string(body), "\n")
	lines = lines[:len(lines)-1] // what follows the last line feed
	if len(lines) == 0 || !bytes.HasSuffix(body, []byte("\n")) {
		return nil, &MalformedError{"no base64 between the marker lines"}
	}
	for i, l := range lines {
		if l == "\n" || len(l) > len(lines[0]) || len(l) < len(lines[0]) && i < len(lines)-1 {
			return nil, &MalformedError{fmt.Sprintf("line %d is not as wide as the first", i+2)}
		}
	}
	joined := strings.ReplaceAll(string(body), "\n", "")
	if strings.ContainsRune(joined, '\r') { // the decoder would skip it
		return nil, &MalformedError{"a carriage return inside a line"}
	}
	blob, err := base64.StdEncoding.Strict().DecodeString(joined)
	if err != nil {
		return nil, &MalformedError{err.Error()}
	}
	return blob, nil
}
