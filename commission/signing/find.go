package signing

import (
	"errors"
	"os"
	"strings"
)

// Find gives the key that a user names: a private key's file, or a public key's file or fingerprint ("SHA256:…") whose private
// half an ssh-agent holds. close ends the agent's connection, after which such a key signs no more.
func Find(name string, passphrase func(path string) ([]byte, error), agentAddress string) (key Key, close func() error, err error) {
	fingerprint := name
	if !strings.HasPrefix(name, "SHA256:") {
		key, err = Load(name, passphrase)
		if !errors.Is(err, ErrPublicOnly) {
			return key, func() error { return nil }, err
		}
		text, err := os.ReadFile(name)
		if err != nil {
			return Key{}, nil, err
		}
		public, err := ParsePublicKey(strings.TrimSpace(string(text)))
		if err != nil {
			return Key{}, nil, err
		}
		fingerprint = public.Fingerprint()
	}
	agent, err := DialAgent(agentAddress)
	if err != nil {
		return Key{}, nil, err
	}
	if key, err = agent.Key(fingerprint); err != nil {
		return Key{}, nil, errors.Join(err, agent.Close())
	}
	return key, agent.Close, nil
}
