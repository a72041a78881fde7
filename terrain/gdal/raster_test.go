package gdal

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ledgework/terrain"
)

func TestBand(t *testing.T) {
	d := openRaster(t, write(t, "a.asc", ascii))
	b, err := d.Band(1)
	if err != nil {
		t.Fatal(err)
	}
	if w, h := b.BlockSize(); w != 3 || h != 1 || b.BlockBytes() != 12 || b.DataType() != "Float32" || b.Number() != 1 {
		t.Errorf("blocks %d × %d, %d bytes, %s, number %d", w, h, b.BlockBytes(), b.DataType(), b.Number())
	}
	if v, ok := b.NoData(); !ok || v != -9999 || b.AllValid() || b.Alpha() || b.Integer() || b.Complex() {
		t.Errorf("nodata %g %t", v, ok)
	}
	if s, o := b.ScaleOffset(); s != 1 || o != 0 {
		t.Errorf("scale %g, offset %g", s, o)
	}
	got := make([]float64, 6)
	if err := b.ReadFloat64(0, 0, 3, 2, got); err != nil {
		t.Fatal(err)
	}
	for i, want := range []float64{1.5, 2.5, -9999, 4.5, math.NaN(), 6.5} {
		if got[i] != want && !(math.IsNaN(got[i]) && math.IsNaN(want)) {
			t.Errorf("value %d is %g, want %g", i, got[i], want)
		}
	}
	valid := make([]uint8, 2)
	if err := b.ReadMasked(1, 0, 1, 2, got, valid); err != nil || got[0] != 2.5 || valid[0] != 1 || valid[1] != 0 {
		t.Errorf("column 1: %v %v %v", got[:2], valid, err)
	}
}

func TestMaskBand(t *testing.T) {
	const band = `<SimpleSource><SourceFilename relativeToVRT="1">a.asc</SourceFilename><SourceBand>1</SourceBand></SimpleSource></VRTRasterBand>`
	const constant = `<VRTRasterBand dataType="Byte" band="%d">%s<ComplexSource><SourceFilename relativeToVRT="1">m.asc</SourceFilename><SourceBand>1</SourceBand></ComplexSource></VRTRasterBand>`
	for name, text := range map[string]string{
		"mask":  `<VRTRasterBand dataType="Float32" band="1">` + band + `<MaskBand>` + fmt.Sprintf(strings.Replace(constant, ` band="%d"`, "%.0d", 1), 0, "") + `</MaskBand>`,
		"alpha": `<VRTRasterBand dataType="Float32" band="1">` + band + fmt.Sprintf(constant, 2, "<ColorInterp>Alpha</ColorInterp>"),
	} {
		path := write(t, "a.vrt", `<VRTDataset rasterXSize="3" rasterYSize="2">`+text+`</VRTDataset>`)
		for file, body := range map[string]string{"a.asc": ascii, "m.asc": "ncols 3\nnrows 2\nxllcorner 0\nyllcorner 0\ncellsize 1\n0 255 255\n255 255 0\n"} {
			if err := os.WriteFile(filepath.Join(filepath.Dir(path), file), []byte(body), 0o600); err != nil {
				t.Fatal(err)
			}
		}
		b, err := openRaster(t, path).Band(1)
		if err != nil {
			t.Fatal(err)
		}
		v, valid := make([]float64, 6), make([]uint8, 6)
		if err := b.ReadMasked(0, 0, 3, 2, v, valid); err != nil {
			t.Fatal(err)
		}
		// The number -9999 means nothing here: this band declares no nodata.
		if want := []byte{0, 1, 1, 1, 0, 0}; !bytes.Equal(valid, want) {
			t.Errorf("%s: valid %v, want %v", name, valid, want)
		}
	}
}

func TestReadErrors(t *testing.T) {
	tiff := keysUTM33()
	// Tag 273, the place of the pixel, points behind the end of the file.
	at := bytes.Index(tiff, []byte{0x11, 0x01, 4, 0, 1, 0, 0, 0})
	if at < 0 {
		t.Fatal("the TIFF has no strip offset")
	}
	binary.LittleEndian.PutUint32(tiff[at+8:], 1<<20)
	path := write(t, "cut.tif", string(tiff))
	b, err := openRaster(t, path).Band(1)
	if err != nil {
		t.Fatal(err)
	}
	err = b.ReadFloat64(0, 0, 1, 1, make([]float64, 1))
	var fe *terrain.FormatError
	if !errors.As(err, &fe) || !strings.Contains(err.Error(), path) || !strings.Contains(err.Error(), "column 0, row 0") || fe.Err == nil {
		t.Errorf("error %v, want the file, the place and GDAL's reason", err)
	}
	t.Log(err)
}

func TestReadPanics(t *testing.T) {
	b, err := openRaster(t, write(t, "a.asc", ascii)).Band(1)
	if err != nil {
		t.Fatal(err)
	}
	for _, w := range [][4]int{{-1, 0, 1, 1}, {0, 0, 4, 1}, {0, 0, 0, 1}, {2, 1, 1, math.MaxInt}, {math.MaxInt, 0, 1, 1}, {0, 0, 3, 2}} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("window %v of a buffer of 5: no panic", w)
				}
			}()
			_ = b.ReadFloat64(w[0], w[1], w[2], w[3], make([]float64, 5))
		}()
	}
}
