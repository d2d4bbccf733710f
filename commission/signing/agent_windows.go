package signing

import (
	"io"
	"os"
)

// agentPipe is where the OpenSSH that comes with Windows listens.
const agentPipe = `\\.\pipe\openssh-ssh-agent`

func dialAgent(address string) (io.ReadWriteCloser, error) {
	if address == "" {
		address = agentPipe
	}
	return os.OpenFile(address, os.O_RDWR, 0)
}
