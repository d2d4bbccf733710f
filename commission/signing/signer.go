package signing

import (
	"bytes"
	"crypto/ed25519"
	"crypto/rand"
	"encoding/pem"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"runtime"
	"strings"

	"golang.org/x/crypto/ssh"
)

// Signer signs in the namespace [Namespace] with one key.
type Signer interface {
	// Sign gives the armoured signature of a message.
	Sign(message []byte) (armored string, err error)
	// SignFrom gives the armoured signature of everything that r holds, without keeping it in memory.
	SignFrom(r io.Reader) (armored string, err error)
	// Fingerprint is "SHA256:…".
	Fingerprint() string
	// AuthorizedKey is the public key in one line: type and base64.
	AuthorizedKey() string
}

// Key is a Signer whose private half is in this process or in an agent. It never prints more than its fingerprint.
type Key struct {
	signer  ssh.Signer
	comment string
}

var _ Signer = Key{}

// Sign gives the armoured signature of a message.
func (k Key) Sign(message []byte) (string, error) { return sign(bytes.NewReader(message), k.signer) }

// SignFrom gives the armoured signature of everything that r holds.
func (k Key) SignFrom(r io.Reader) (string, error) { return sign(r, k.signer) }

// Fingerprint is "SHA256:…".
func (k Key) Fingerprint() string { return k.Public().Fingerprint() }

// AuthorizedKey is the public key in one line.
func (k Key) AuthorizedKey() string { return k.Public().AuthorizedKey() }

// Public is the public half.
func (k Key) Public() PublicKey { return PublicKey{k.signer.PublicKey()} }

// Comment is what the key's owner wrote beside it, or "".
func (k Key) Comment() string { return k.comment }

// String is the fingerprint: a key that gets into a message or a log shows nothing else.
func (k Key) String() string { return k.Fingerprint() }

// GoString is the fingerprint too.
func (k Key) GoString() string { return k.Fingerprint() }

// Generate makes an Ed25519 key that lives only in this process: the throw-away key of a rehearsal.
func Generate() (Key, error) {
	_, private, err := ed25519.GenerateKey(rand.Reader)
	if err != nil {
		return Key{}, fmt.Errorf("make a key: %w", err)
	}
	signer, err := ssh.NewSignerFromKey(private)
	return Key{signer: signer, comment: "throw-away"}, err
}

// WriteNew makes an Ed25519 key and writes it in OpenSSH's form: path with mode 0600, path.pub beside it. An empty
// passphrase leaves the key unencrypted. It never overwrites anything.
func WriteNew(path, comment string, passphrase []byte) (Key, error) {
	if strings.ContainsFunc(comment, func(r rune) bool { return r < ' ' || r == 0x7f }) {
		return Key{}, errors.New("the key's comment holds a control character")
	}
	if _, err := os.Lstat(path + ".pub"); !errors.Is(err, fs.ErrNotExist) {
		return Key{}, fmt.Errorf("%s.pub exists already; choose another name", path)
	}
	_, private, err := ed25519.GenerateKey(rand.Reader)
	if err != nil {
		return Key{}, fmt.Errorf("make a key: %w", err)
	}
	block, err := ssh.MarshalPrivateKey(private, comment)
	if len(passphrase) > 0 {
		block, err = ssh.MarshalPrivateKeyWithPassphrase(private, comment, passphrase)
	}
	if err != nil {
		return Key{}, fmt.Errorf("encode the key: %w", err)
	}
	signer, err := ssh.NewSignerFromKey(private)
	if err != nil {
		return Key{}, err
	}
	key := Key{signer: signer, comment: comment}
	if err := writeNewFile(path, pem.EncodeToMemory(block), 0o600); err != nil {
		return Key{}, err
	}
	line := strings.TrimSpace(key.AuthorizedKey()+" "+comment) + "\n"
	return key, writeNewFile(path+".pub", []byte(line), 0o644)
}

// writeNewFile creates a file that is not there yet, and has it on disk before it returns.
func writeNewFile(path string, text []byte, mode fs.FileMode) error {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, mode)
	if errors.Is(err, fs.ErrExist) {
		return fmt.Errorf("%s exists already; choose another name", path)
	}
	if err != nil {
		return err
	}
	_, err = f.Write(text)
	return errors.Join(err, f.Sync(), f.Close())
}

// TooOpenError says that others can read a private key.
type TooOpenError struct {
	Path string
	Mode fs.FileMode
}

func (e *TooOpenError) Error() string {
	return fmt.Sprintf("%s has mode %04o: others can read this private key; chmod 600 it, and ask whether it is still secret",
		e.Path, e.Mode.Perm())
}

// ErrPassphrase says that a passphrase was wrong.
var ErrPassphrase = errors.New("the passphrase does not open the key")

// ErrPublicOnly says that a file holds a public key; the private half may be in an agent.
var ErrPublicOnly = errors.New("this is a public key; give the private one, or have it in ssh-agent")

// Load reads an OpenSSH (or PEM) private key: Ed25519, ECDSA or RSA. Where the key is encrypted, passphrase is asked once;
// it may be nil when nobody can answer. On Unix a key that others can read is refused.
func Load(path string, passphrase func(path string) ([]byte, error)) (Key, error) {
	info, err := os.Stat(path)
	if err != nil {
		return Key{}, err
	}
	if !info.Mode().IsRegular() || info.Size() > maxArmour {
		return Key{}, fmt.Errorf("%s is no key file", path)
	}
	text, err := os.ReadFile(path)
	if err != nil {
		return Key{}, err
	}
	if _, err := ParsePublicKey(strings.TrimSpace(string(text))); err == nil {
		return Key{}, fmt.Errorf("%s: %w", path, ErrPublicOnly)
	}
	if runtime.GOOS != "windows" && info.Mode().Perm()&0o077 != 0 {
		return Key{}, &TooOpenError{path, info.Mode()}
	}
	signer, err := ssh.ParsePrivateKey(text)
	if _, locked := errors.AsType[*ssh.PassphraseMissingError](err); locked {
		if passphrase == nil {
			return Key{}, fmt.Errorf("%s needs its passphrase, and there is nobody to ask; use ssh-agent", path)
		}
		word, askErr := passphrase(path)
		if askErr != nil {
			return Key{}, askErr
		}
		signer, err = ssh.ParsePrivateKeyWithPassphrase(text, word)
		clear(word)
		if err != nil {
			return Key{}, fmt.Errorf("%s: %w", path, ErrPassphrase)
		}
	}
	if err != nil {
		return Key{}, fmt.Errorf("%s is no OpenSSH private key: %w", path, err)
	}
	if !usable(signer.PublicKey().Type()) {
		return Key{}, fmt.Errorf("%s is a %s key; wanted Ed25519, ECDSA or RSA", path, signer.PublicKey().Type())
	}
	return Key{signer: signer}, nil
}

// usable tells whether SSHSIG allows the type of key. DSA is too weak, certificates are not read.
func usable(keyType string) bool {
	switch keyType {
	case ssh.KeyAlgoED25519, ssh.KeyAlgoRSA, ssh.KeyAlgoECDSA256, ssh.KeyAlgoECDSA384, ssh.KeyAlgoECDSA521,
		ssh.KeyAlgoSKED25519, ssh.KeyAlgoSKECDSA256:
		return true
	}
	return false
}
