package signing

import (
	"errors"
	"fmt"
	"io"

	"golang.org/x/crypto/ssh"
	"golang.org/x/crypto/ssh/agent"
)

// Agent is a running ssh-agent. Keys on hardware are reached through it.
type Agent struct {
	connection io.ReadWriteCloser
	client     agent.ExtendedAgent
}

// ErrNoAgent says that no ssh-agent can be reached.
var ErrNoAgent = errors.New("no ssh-agent")

// DialAgent connects to an ssh-agent. The address is what SSH_AUTH_SOCK says; when it is empty, Windows has a fixed pipe
// and other systems have none.
func DialAgent(address string) (*Agent, error) {
	connection, err := dialAgent(address)
	if err != nil {
		return nil, fmt.Errorf("%w: %w", ErrNoAgent, err)
	}
	return NewAgent(connection), nil
}

// NewAgent speaks the agent's protocol over a connection.
func NewAgent(connection io.ReadWriteCloser) *Agent {
	return &Agent{connection, agent.NewClient(connection)}
}

// Keys are the agent's keys that can sign a log, in its own order. They work until Close.
func (a *Agent) Keys() ([]Key, error) {
	signers, err := a.client.Signers()
	if err != nil {
		return nil, fmt.Errorf("ask ssh-agent for its keys: %w", err)
	}
	listed, err := a.client.List()
	if err != nil {
		return nil, fmt.Errorf("ask ssh-agent for its keys: %w", err)
	}
	comments := map[string]string{}
	for _, k := range listed {
		comments[ssh.FingerprintSHA256(k)] = k.Comment
	}
	var keys []Key
	for _, s := range signers {
		if usable(s.PublicKey().Type()) {
			keys = append(keys, Key{signer: s, comment: comments[ssh.FingerprintSHA256(s.PublicKey())]})
		}
	}
	return keys, nil
}

// Key is the agent's key with a fingerprint ("SHA256:…").
func (a *Agent) Key(fingerprint string) (Key, error) {
	keys, err := a.Keys()
	if err != nil {
		return Key{}, err
	}
	for _, k := range keys {
		if k.Fingerprint() == fingerprint {
			return k, nil
		}
	}
	return Key{}, fmt.Errorf("ssh-agent holds %d usable keys, none of them %s; add it with ssh-add", len(keys), fingerprint)
}

// Close ends the connection.
func (a *Agent) Close() error { return a.connection.Close() }
