package export

import (
	"io"
)

// LayerDir is the folder of the layers within a run folder.
const LayerDir = "layers"

// WriteLayers writes every layer of the site as LayerDir/NAME.geojson. Without
// a working CRS, or without a projector, it writes nothing and returns
// ErrNoCRS: WriteLocal is for that.
func WriteLayers(f *Folder, s *Site, p Projector, valid ValidityCheck) (warnings []string, err error) {
	if s.CRS.Local() || p == nil {
		return nil, ErrNoCRS
	}
	tables, err := Tables(s)
	if err != nil {
		return nil, err
	}
	for _, t := range tables {
		err := f.Write(LayerDir+"/"+t.Name+".geojson", func(w io.Writer) error {
			more, err := WriteGeoJSON(w, t, p, valid)
			warnings = append(warnings, more...)
			return err
		})
		if err != nil {
			return warnings, err
		}
	}
	return warnings, nil
}

// WriteLocal writes every layer of the site as a table LayerDir/NAME.csv in
// working coordinates, with its column types in NAME.csvt and the caution in
// CAUTION.txt. It needs no CRS.
func WriteLocal(f *Folder, s *Site) error {
	tables, err := Tables(s)
	if err != nil {
		return err
	}
	for _, t := range tables {
		if err := f.Write(LayerDir+"/"+t.Name+".csv", func(w io.Writer) error { return WriteCSV(w, t) }); err != nil {
			return err
		}
		if err := f.Write(LayerDir+"/"+t.Name+".csvt", func(w io.Writer) error { return WriteCSVTypes(w, t.Layer) }); err != nil {
			return err
		}
	}
	return f.Write(LayerDir+"/CAUTION.txt", func(w io.Writer) error {
		_, err := io.WriteString(w, Caution+"\n")
		return err
	})
}
