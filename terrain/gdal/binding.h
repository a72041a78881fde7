// What the Go files of this package ask of libgdal and libproj. Every function
// that can fail takes a log, clears it, and fills it with the messages that the
// libraries emitted during that one call; the caller frees it with
// lw_log_free. Strings and blobs that a function hands out are freed with
// lw_free.
#ifndef LEDGEWORK_GDAL_H
#define LEDGEWORK_GDAL_H

#include <stddef.h>
#include <stdint.h>

typedef struct {
	char *text; // messages, one a line, NULL if none
	size_t len;
	int dropped;  // messages left out because the text was full
	int failures; // messages worse than a warning
} lw_log;

void lw_log_free(lw_log *log);
void lw_free(void *p);
char *lw_version(void);

// dataset.go

typedef struct {
	void *handle;
	int width, height, bands, layers;
	int has_transform, gcps;
	double transform[6];
	char *driver, *crs;
} lw_dataset;

int lw_open(const char *path, int vector, lw_dataset *out, lw_log *log);
int lw_close(void *dataset, lw_log *log);
char *lw_metadata(void *dataset, int band, const char *key, const char *domain, lw_log *log);

// raster.go

typedef struct {
	int block_width, block_height;
	int bytes; // of one value
	int mask;  // GMF_ flags of the mask band
	int alpha; // the band is itself an alpha channel
	int has_nodata, has_scale, has_offset;
	double nodata, scale, offset;
	char *type, *unit, *description;
} lw_band;

int lw_band_describe(void *dataset, int band, lw_band *out, lw_log *log);
// valid may be NULL; otherwise it receives the mask, one byte a cell.
int lw_band_read(void *dataset, int band, int x, int y, int w, int h, double *values, uint8_t *valid, lw_log *log);

// vector.go

typedef struct {
	char *name, *crs, *fields; // fields: name and kind (s i f), each ended by a newline
	int64_t count;             // -1 when counting would read the layer
} lw_layer;

typedef struct {
	uint8_t *data;
	size_t len;
	int count;
} lw_features;

int lw_layer_describe(void *dataset, int layer, lw_layer *out, lw_log *log);
// Reads at most max features on from the layer's cursor, from its start if rewind.
int lw_layer_read(void *dataset, int layer, int rewind, int max, lw_features *out, lw_log *log);

// crs.go

typedef struct {
	void *handle;
	int projected, geographic, compound, geocentric, local, three_d;
	int utm_zone, utm_north;
	double linear_factor, vertical_factor;
	char *name, *authority, *wkt, *projjson, *linear_unit, *vertical_unit, *vertical_name;
} lw_crs;

int lw_crs_parse(const char *text, lw_crs *out, lw_log *log);
int lw_crs_horizontal(void *crs, lw_crs *out, lw_log *log);
void lw_crs_close(void *crs);
// Returns the WKT of the CRS of an in-memory TIFF file, NULL if it has none.
char *lw_crs_of_tiff(const uint8_t *tiff, size_t len, lw_log *log);

// transform.go

typedef struct lw_transform lw_transform;

lw_transform *lw_transform_new(const char *source, const char *target, lw_log *log);
lw_transform *lw_transform_pipeline(const char *pipeline, lw_log *log);
void lw_transform_close(lw_transform *t);
// z may be NULL. Returns how many points failed, the first of them in *first.
int64_t lw_transform_apply(lw_transform *t, int inverse, double *x, double *y, double *z, int64_t n, int64_t *first, lw_log *log);
char *lw_transform_describe(lw_transform *t, double *accuracy, int *ballpark, lw_log *log);

// geometry.go

enum { LW_VALID, LW_AREA, LW_UNION, LW_MAKE_VALID };

// Does one of the above; number receives validity or area, *out the geometry.
int lw_geometry(int what, const uint8_t *wkb, size_t len, double *number, uint8_t **out, size_t *out_len, lw_log *log);

// Shared by the C files: every call into the libraries stands between lw_begin
// and lw_end, on one thread, with log collecting.
void lw_begin(lw_log *log);
void lw_end(void);
void lw_note(lw_log *log, const char *text);
char *lw_wkt(void *srs);

#endif
