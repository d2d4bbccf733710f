package signing_test

import (
	"strings"
	"testing"
	"time"

	"chargehand/commission/signing"
)

// Whatever is read as a signature, only the message it was made of fits it.
func FuzzParse(f *testing.F) {
	for _, name := range []string{"message.ed25519.sig", "message.ecdsa.sig", "message.rsa.sha256.sig", "message.namespace.sig"} {
		f.Add(read(f, name))
	}
	f.Fuzz(func(t *testing.T, text string) {
		s, err := signing.Parse([]byte(text))
		if err != nil {
			if s != nil {
				t.Errorf("Parse = %v beside the error %v", s, err)
			}
			return
		}
		if !s.Key().IsValid() || s.HashAlgorithm() != "sha512" && s.HashAlgorithm() != "sha256" {
			t.Errorf("Parse = %s by %s, want a known hash and a key", s.HashAlgorithm(), s.Key())
		}
		h := s.NewHash()
		h.Write([]byte("a message that no signature in the corpus is of"))
		if s.VerifyDigest(h.Sum(nil)) == nil {
			t.Error("VerifyDigest of another message = nil, want ErrMismatch")
		}
	})
}

// What is read as a list has principals and a key in each entry, and never panics when asked.
func FuzzParseAllowed(f *testing.F) {
	f.Add(`tech@example.org namespaces="a,b",valid-after="20240101Z" ` + strings.TrimSpace(read(f, "ed25519.pub")))
	f.Add("*@example.org,!x cert-authority " + read(f, "rsa.pub") + "\n# comment\n\"quoted\" " + read(f, "ecdsa.pub"))
	f.Fuzz(func(t *testing.T, text string) {
		list, err := signing.ParseAllowed("list", strings.NewReader(text), time.UTC)
		if err != nil {
			return
		}
		for _, e := range list.Entries() {
			if e.Principals == "" || !e.Key.IsValid() || e.Line < 1 {
				t.Errorf("ParseAllowed(%q) = %+v, want principals and a key", text, e)
			}
			e.Allows("tech@example.org")
			if _, err := list.Find(e.Key, time.Time{}); err == nil && e.Key.Fingerprint() == "" {
				t.Error("Find allows a key without a fingerprint")
			}
		}
	})
}
