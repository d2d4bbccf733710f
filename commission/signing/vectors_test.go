package signing

import (
	"crypto/ed25519"
	"crypto/sha512"
	"encoding/hex"
	"errors"
	"strings"
	"testing"

	"golang.org/x/crypto/ssh"
)

// The fixed vectors below were made with OpenSSH 9.2p1, by `ssh-keygen -Y sign -n commissioning-log@example.org`; the
// private key no longer exists.
const (
	vectorMessage   = "commissioning log, entry 1\n"
	vectorNamespace = "commissioning-log@example.org"
	vectorKey       = "ssh-ed25519 AAAAC3NzaC1lZDI1NTE5AAAAIJWQkbxvsHEKeGvtMAysGtRqn6DRVe64EK5LV6l7f9d9 tech@example.org"
	vectorPrint     = "SHA256:xffRMQtQ5rToNWmj0sfhQZrBHRlaU1qqv3POdtdJAcs"
	vectorSHA512    = `-----BEGIN SSH SIGNATURE-----
U1NIU0lHAAAAAQAAADMAAAALc3NoLWVkMjU1MTkAAAAglZCRvG+wcQp4a+0wDKwa1GqfoN
FV7rgQrktXqXt/130AAAAdY29tbWlzc2lvbmluZy1sb2dAZXhhbXBsZS5vcmcAAAAAAAAA
BnNoYTUxMgAAAFMAAAALc3NoLWVkMjU1MTkAAABAgYFpDclCVMKoLsefVFxsBYJMd/AhD5
gqrMkj0GevqgC+YuYw3CBzb5uczuiySgDp7sDolL8NCI1HdtQH5UFpCQ==
-----END SSH SIGNATURE-----
`
	vectorSHA256 = `-----BEGIN SSH SIGNATURE-----
U1NIU0lHAAAAAQAAADMAAAALc3NoLWVkMjU1MTkAAAAglZCRvG+wcQp4a+0wDKwa1GqfoN
FV7rgQrktXqXt/130AAAAdY29tbWlzc2lvbmluZy1sb2dAZXhhbXBsZS5vcmcAAAAAAAAA
BnNoYTI1NgAAAFMAAAALc3NoLWVkMjU1MTkAAABAq9DmfPUEjn3L8cN5/96Xq9tgD0HE/S
yDMFzky8LZqcKhV3WAfnYMPqy/CCxx0wdBMpvxG0p0/U+Ryf/uJkfUAA==
-----END SSH SIGNATURE-----
`
	// OpenSSH's own PROTOCOL.sshsig shows this body; it lacks the hash algorithm, and ssh-keygen refuses it too.
	vectorMalformed = `-----BEGIN SSH SIGNATURE-----
U1NIU0lHAAAAAQAAADMAAAALc3NoLWVkMjU1MTkAAAAgJKxoLBJBivUPNTUJUSslQTt2hD
jozKvHarKeN8uYFqgAAAADZm9vAAAAAAAAAFMAAAALc3NoLWVkMjU1MTkAAABAKNC4IEbt
Tq0Fb56xhtuE1/lK9H9RZJfON4o6hE9R4ZGFX98gy0+fFJ/1d2/RxnZky0Y7GojwrZkrHT
FgCqVWAQ==
-----END SSH SIGNATURE-----
`
)

func TestVectorsOfOpenSSH(t *testing.T) {
	key, err := ParsePublicKey(vectorKey)
	if err != nil || key.Fingerprint() != vectorPrint {
		t.Fatalf("ParsePublicKey = %s, %v, want %s", key, err, vectorPrint)
	}
	for name, armoured := range map[string]string{"sha512": vectorSHA512, "sha256": vectorSHA256} {
		s, err := parse([]byte(armoured), vectorNamespace)
		if err != nil {
			t.Fatalf("parse(%s) = %v", name, err)
		}
		if s.HashAlgorithm() != name || !s.Key().Equal(key) {
			t.Errorf("parse(%s) = %s by %s, want %s by %s", name, s.HashAlgorithm(), s.Key(), name, key)
		}
		for _, c := range []struct {
			message string
			want    error
		}{{vectorMessage, nil}, {"commissioning log, entry 2\n", ErrMismatch}, {"", ErrMismatch}} {
			h := s.NewHash()
			h.Write([]byte(c.message))
			if got := s.VerifyDigest(h.Sum(nil)); got != c.want {
				t.Errorf("%s: VerifyDigest(%q) = %v, want %v", name, c.message, got, c.want)
			}
		}
		if got := armour(s.inner.Marshal()); got != armoured {
			t.Errorf("%s: armour = %s, want OpenSSH's own bytes %s", name, got, armoured)
		}
		if _, err := Parse([]byte(armoured)); !asNamespace(err) {
			t.Errorf("Parse(%s) = %v, want a NamespaceError", name, err)
		}
	}
	if blob, err := dearmour([]byte(vectorSHA512)); err != nil || len(blob) != 199 {
		t.Errorf("dearmour = %d bytes, %v, want 199", len(blob), err)
	}
	loose := strings.Replace(vectorSHA512, "CQ==", "CR==", 1) // the same bytes, with bits set in the padding
	if _, err := parse([]byte(loose), vectorNamespace); err == nil {
		t.Error("parse with bits in the padding = nil, want an error")
	}
	if _, err := parse([]byte(vectorMalformed), "foo"); err == nil {
		t.Error("parse of the example without a hash algorithm = nil, want an error")
	} else if _, ok := errors.AsType[*MalformedError](err); !ok {
		t.Errorf("parse of the example without a hash algorithm = %v, want a MalformedError", err)
	}
}

func asNamespace(err error) bool {
	_, ok := errors.AsType[*NamespaceError](err)
	return ok
}

func TestVectorsOfRFC8032(t *testing.T) {
	abc := sha512.Sum512([]byte("abc"))
	for _, c := range []struct{ name, seed, public, message, signature string }{ // section 7.1
		{"TEST 1", "9d61b19deffd5a60ba844af492ec2cc44449c5697b326919703bac031cae7f60", "d75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a", "",
			"e5564300c360ac729086e2cc806e828a84877f1eb8e5d974d873e065224901555fb8821590a33bacc61e39701cf9b46bd25bf5f0595bbe24655141438e7a100b"},
		{"TEST 2", "4ccd089b28ff96da9db6c346ec114e0f5b8a319f35aba624da8cf6ed4fb8a6fb", "3d4017c3e843895a92b70aa74d1b7ebc9c982ccf2ec4968cc0cd55f12af4660c", "72",
			"92a009a9f0d4cab8720e820b5f642540a2b27b5416503f8fb3762223ebdb69da085ac1e43e15996e458f3613d0f11d8c387b2eaeb4302aeeb00d291612bb0c00"},
		{"TEST 3", "c5aa8df43f9f837bedb7442f31dcb7b166d38535076f094b85ce3a2e0b4458f7", "fc51cd8e6218a1a38da47ed00230f0580816ed13ba3303ac5deb911548908025", "af82",
			"6291d657deec24024827e69c3abe01a30ce548a284743a445e3680d7db5ac3ac18ff9b538d16f290ae67f760984dc6594a7c15e9716ed28dc027beceea1ec40a"},
		{"TEST SHA(abc)", "833fe62409237b9d62ec77587520911e9a759cec1d19755b7da901b96dca3d42", "ec172b93ad5e563bf4932c70e1245034c35467ef2efd4d64ebf819683467e2bf", hex.EncodeToString(abc[:]),
			"dc2a4459e7369633a52b1bf277839a00201009a3efbf3ecb69bea2186c26b58909351fc9ac90b3ecfdfbc7c66431e0303dca179c138ac17ad9bef1177331a704"},
	} {
		seed, _ := hex.DecodeString(c.seed)
		message, _ := hex.DecodeString(c.message)
		signer, err := ssh.NewSignerFromKey(ed25519.NewKeyFromSeed(seed))
		if err != nil {
			t.Fatal(err)
		}
		if got := hex.EncodeToString(signer.PublicKey().Marshal()); !strings.HasSuffix(got, c.public) {
			t.Errorf("%s: public key = %s, want %s at its end", c.name, got, c.public)
		}
		s, err := signer.Sign(nil, message)
		if err != nil || hex.EncodeToString(s.Blob) != c.signature {
			t.Errorf("%s: Sign = %x, %v, want %s", c.name, s.Blob, err, c.signature)
		}
		if err := signer.PublicKey().Verify(append(message, 0), s); err == nil {
			t.Errorf("%s: Verify of a longer message = nil, want an error", c.name)
		}
	}
}
