package solve

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"os"

	"rundle/internal/modelfile"
	"rundle/internal/runfolder"
	"rundle/mps"
)

// originOf is the identity of a run: the model and, if there is one, the state that it starts from.
func originOf(m *modelfile.Model, startDir string) (runfolder.Origin, *mps.State, error) {
	o := runfolder.Origin{Text: m.Source, Hash: m.Hash}
	if startDir == "" {
		return o, nil, nil
	}
	path := runfolder.StatePath(startDir, 0)
	digest, err := digestOf(path)
	if os.IsNotExist(err) {
		return o, nil, refuse("start folder %s: no state-0.npz in it; name the folder of a finished run", startDir)
	}
	if err != nil {
		return o, nil, refuse("start folder %s: %w", startDir, err)
	}
	state, err := mps.Load(path)
	if err != nil {
		return o, nil, refused(err)
	}
	sum := sha256.Sum256([]byte(m.Hash + "\nstart = " + digest))
	o.Hash = hex.EncodeToString(sum[:])
	o.Settings = map[string]string{"start": fmt.Sprintf("%s (state %.8s)", startDir, digest)}
	return o, state, nil
}

func digestOf(path string) (string, error) {
	f, err := os.Open(path)
	if err != nil {
		return "", err
	}
	defer f.Close()
	h := sha256.New()
	if _, err := io.Copy(h, f); err != nil {
		return "", err
	}
	return hex.EncodeToString(h.Sum(nil)), nil
}
