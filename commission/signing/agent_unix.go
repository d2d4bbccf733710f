//go:build !windows

package signing

import (
	"errors"
	"io"
	"net"
)

func dialAgent(address string) (io.ReadWriteCloser, error) {
	if address == "" {
		return nil, errors.New("SSH_AUTH_SOCK is not set; start one with `eval $(ssh-agent)`, then `ssh-add`")
	}
	return net.Dial("unix", address)
}
