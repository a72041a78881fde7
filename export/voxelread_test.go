package export

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"reflect"
	"runtime"
	"strings"
	"testing"

	"github.com/parquet-go/parquet-go"

	"ledgework/terrain"
)

// Every byte matters: with any one changed, the file is refused.
func TestReadVoxelsDamaged(t *testing.T) {
	v := randomVoxels(t, 50, true)
	b := encode(t, v)
	for at := range b {
		damaged := bytes.Clone(b)
		damaged[at] ^= 1 << (at % 8)
		var format *terrain.FormatError
		if _, _, err := ReadVoxels(bytes.NewReader(damaged), int64(len(damaged))); !errors.As(err, &format) {
			t.Errorf("byte %d of %d changed: error %v", at, len(b), err)
		}
	}
	for size := 0; size < len(b); size += 97 {
		if _, _, err := ReadVoxels(bytes.NewReader(b[:size]), int64(size)); err == nil {
			t.Errorf("a file cut to %d of %d bytes was read", size, len(b))
		}
	}
}

func TestReadVoxelsOfOtherOrigin(t *testing.T) {
	var b bytes.Buffer
	if err := parquet.Write(&b, []struct{ A int64 }{{1}, {2}}); err != nil {
		t.Fatal(err)
	}
	_, _, err := ReadVoxels(bytes.NewReader(b.Bytes()), int64(b.Len()))
	if err == nil || !strings.Contains(err.Error(), "holds no voxels") {
		t.Errorf("error %v", err)
	}
	later := reseal(t, bytes.Replace(encode(t, randomVoxels(t, 1, false)), []byte(keyFormat+"\x18\x01"+voxelFormat), []byte(keyFormat+"\x18\x01"+"9"), 1))
	_, _, err = ReadVoxels(bytes.NewReader(later), int64(len(later)))
	var unsupported *terrain.UnsupportedError
	if !errors.As(err, &unsupported) {
		t.Errorf("error %v, want one of an unsupported format", err)
	}
}

// reseal gives a changed file its checksum.
func reseal(t *testing.T, b []byte) []byte {
	t.Helper()
	at := sealAt(b)
	if at < 0 {
		t.Fatal("no checksum in the file")
	}
	copy(b[at:], unsealed())
	sum := sha256.Sum256(b)
	hex.Encode(b[at:], sum[:])
	return b
}

// FuzzReadVoxels asserts that whatever is read can be written and read again
// unchanged, and that memory stays bounded. A file with a place for the
// checksum is tried with a right one too, or the fuzzer would get no further.
func FuzzReadVoxels(f *testing.F) {
	for _, v := range []*terrain.Voxels{randomVoxels(f, 1, false), randomVoxels(f, 20, true)} {
		b := encode(f, v)
		f.Add(b)
		f.Add(b[:len(b)-9])
	}
	f.Add([]byte("PAR1PAR1"))
	f.Fuzz(func(t *testing.T, b []byte) {
		fuzzVoxels(t, b)
		if sealAt(b) >= 0 {
			fuzzVoxels(t, reseal(t, bytes.Clone(b)))
		}
	})
}

func fuzzVoxels(t *testing.T, b []byte) {
	t.Helper()
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	v, meta, err := ReadVoxels(bytes.NewReader(b), int64(len(b)))
	runtime.ReadMemStats(&after)
	if grown := after.TotalAlloc - before.TotalAlloc; grown > 256<<20 {
		t.Errorf("took %d bytes for a file of %d", grown, len(b))
	}
	if err != nil {
		return
	}
	var out bytes.Buffer
	if err := WriteVoxels(&out, v, meta); err != nil {
		t.Fatal(err)
	}
	again, metaAgain, err := ReadVoxels(bytes.NewReader(out.Bytes()), int64(out.Len()))
	if err != nil || !reflect.DeepEqual(again, v) {
		t.Errorf("came back changed: %v", err)
	}
	// Empty lists in the meta may come back as missing ones.
	first, err := json.Marshal(meta)
	if err != nil {
		t.Fatal(err)
	}
	second, err := json.Marshal(metaAgain)
	if err != nil || !bytes.Equal(first, second) {
		t.Errorf("meta %s came back as %s, %v", first, second, err)
	}
}
