#include "binding.h"

#include <pthread.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cpl_conv.h>
#include <cpl_error.h>
#include <cpl_string.h>
#include <cpl_vsi.h>
#include <gdal.h>
#include <ogr_api.h>
#include <ogr_srs_api.h>
#include <proj.h>

// ---- messages

// A file that warns about each of a million cells must not fill the memory.
enum { LOG_MAX = 4096 };

void lw_note(lw_log *log, const char *text) {
	size_t n = strlen(text);
	// The same warning again says nothing new.
	if (log->text && strstr(log->text, text)) return;
	if (log->len + n + 1 > LOG_MAX) {
		log->dropped++;
		return;
	}
	char *grown = realloc(log->text, log->len + n + 2);
	if (!grown) return;
	log->text = grown;
	if (log->len > 0) log->text[log->len++] = '\n';
	memcpy(log->text + log->len, text, n + 1);
	log->len += n;
}

static void collect(CPLErr class, CPLErrorNum number, const char *text) {
	(void)number;
	lw_log *log = CPLGetErrorHandlerUserData();
	if (!log || class == CE_None || class == CE_Debug) return;
	if (class >= CE_Failure) log->failures++;
	lw_note(log, text);
}

// PROJ's own contexts, as libgeotiff makes them, would write to standard error.
// What they say goes to the collector of the call that they serve instead. It is
// a warning: whether the call failed is what the call itself says.
static void collect_default(void *user, int level, const char *text) {
	(void)user;
	if (level == PJ_LOG_ERROR) CPLError(CE_Warning, CPLE_AppDefined, "%s", text);
}

void lw_log_free(lw_log *log) {
	free(log->text);
	log->text = NULL;
	log->len = 0;
}

void lw_free(void *p) { CPLFree(p); }

// ---- start, once a process

static void *refuse_open(void *user, const char *path, const char *access) {
	(void)user;
	(void)access;
	CPLError(CE_Failure, CPLE_OpenFailed, "the network is not read: %s", path);
	return NULL;
}

static int refuse_stat(void *user, const char *path, VSIStatBufL *stat, int flags) {
	(void)user;
	(void)stat;
	(void)flags;
	CPLError(CE_Failure, CPLE_OpenFailed, "the network is not read: %s", path);
	return -1;
}

// A survey is a local file, and reading it must never leave the machine: a VRT
// or a service description could name any host. The network file systems are
// replaced by ones that refuse, and the drivers that are clients of a service
// are taken away.
static void start(void) {
	const char *const systems[] = {"/vsicurl/", "/vsicurl?", "/vsicurl_streaming/", "/vsis3/", "/vsis3_streaming/", "/vsigs/",
		"/vsigs_streaming/", "/vsiaz/", "/vsiaz_streaming/", "/vsiadls/", "/vsioss/", "/vsioss_streaming/", "/vsiswift/",
		"/vsiswift_streaming/", "/vsiwebhdfs/", "/vsihdfs/", NULL};
	const char *const services[] = {"HTTP", "WMS", "WCS", "WMTS", "DAAS", "EEDA", "EEDAI", "PLMOSAIC", "PLSCENES", "NGW", "WFS",
		"OAPIF", "OGCAPI", "CSW", "Elasticsearch", "CouchDB", "Cloudant", "CARTO", "AmigoCloud", "GMLAS", "PostgreSQL",
		"PostGISRaster", "MySQL", "MSSQLSpatial", "OCI", "GeoRaster", "ODBC", "PGeo", "MongoDBv3", "STACTA", "STACIT", "HANA", NULL};
	CPLPushErrorHandler(CPLQuietErrorHandler);
	CPLSetConfigOption("GDAL_VRT_ENABLE_PYTHON", "NO");
	OSRSetPROJEnableNetwork(0);
	proj_log_func(NULL, NULL, collect_default); // new contexts are copies of the default one
	// Blocks are read once and in order; by default the cache would keep a
	// twentieth of the machine's memory of them.
	if (!CPLGetConfigOption("GDAL_CACHEMAX", NULL)) GDALSetCacheMax64(64 << 20);
	GDALAllRegister();
	for (int i = 0; services[i]; i++) {
		GDALDriverH driver = GDALGetDriverByName(services[i]);
		if (!driver) continue;
		GDALDeregisterDriver(driver);
		GDALDestroyDriver(driver);
	}
	VSIFilesystemPluginCallbacksStruct *refuse = VSIAllocFilesystemPluginCallbacksStruct();
	refuse->open = refuse_open;
	refuse->stat = refuse_stat;
	for (int i = 0; systems[i]; i++) VSIInstallPluginHandler(systems[i], refuse);
	VSIFreeFilesystemPluginCallbacksStruct(refuse);
	CPLPopErrorHandler();
}

void lw_begin(lw_log *log) {
	static pthread_once_t once = PTHREAD_ONCE_INIT;
	pthread_once(&once, start);
	memset(log, 0, sizeof *log);
	CPLPushErrorHandlerEx(collect, log);
}

void lw_end(void) {
	CPLPopErrorHandler();
	CPLErrorReset();
}

char *lw_version(void) {
	char text[128];
	snprintf(text, sizeof text, "GDAL %s, PROJ %s", GDALVersionInfo("RELEASE_NAME"), proj_info().version);
	return CPLStrdup(text);
}

// ---- datasets

char *lw_wkt(void * srs) {
	const char *const options[] = {"FORMAT=WKT2_2019", NULL};
	char *wkt = NULL;
	if (!srs || OSRExportToWktEx(srs, &wkt, options) != OGRERR_NONE || !wkt || !*wkt) {
		CPLFree(wkt);
		return NULL;
	}
	return wkt;
}

int lw_open(const char *path, int vector, lw_dataset *out, lw_log *log) {
	lw_begin(log);
	memset(out, 0, sizeof *out);
	unsigned flags = GDAL_OF_READONLY | GDAL_OF_VERBOSE_ERROR | (vector ? GDAL_OF_VECTOR : GDAL_OF_RASTER);
	GDALDatasetH ds = GDALOpenEx(path, flags, NULL, NULL, NULL);
	if (ds) {
		out->handle = ds;
		out->driver = CPLStrdup(GDALGetDriverShortName(GDALGetDatasetDriver(ds)));
		if (vector) {
			out->layers = GDALDatasetGetLayerCount(ds);
		} else {
			out->width = GDALGetRasterXSize(ds);
			out->height = GDALGetRasterYSize(ds);
			out->bands = GDALGetRasterCount(ds);
			out->has_transform = GDALGetGeoTransform(ds, out->transform) == CE_None;
			out->gcps = GDALGetGCPCount(ds);
			out->crs = lw_wkt(GDALGetSpatialRef(ds));
		}
	}
	lw_end();
	return ds != NULL;
}

int lw_close(void *dataset, lw_log *log) {
	lw_begin(log);
	GDALClose(dataset);
	lw_end();
	return log->failures == 0;
}

char *lw_metadata(void *dataset, int band, const char *key, const char *domain, lw_log *log) {
	lw_begin(log);
	GDALMajorObjectH object = band > 0 ? GDALGetRasterBand(dataset, band) : dataset;
	const char *value = object ? GDALGetMetadataItem(object, key, domain) : NULL;
	char *copy = value ? CPLStrdup(value) : NULL;
	lw_end();
	return copy;
}

// ---- rasters

int lw_band_describe(void *dataset, int band, lw_band *out, lw_log *log) {
	lw_begin(log);
	memset(out, 0, sizeof *out);
	GDALRasterBandH b = GDALGetRasterBand(dataset, band);
	if (b) {
		GDALGetBlockSize(b, &out->block_width, &out->block_height);
		out->bytes = GDALGetDataTypeSizeBytes(GDALGetRasterDataType(b));
		out->mask = GDALGetMaskFlags(b);
		out->alpha = GDALGetRasterColorInterpretation(b) == GCI_AlphaBand;
		out->nodata = GDALGetRasterNoDataValue(b, &out->has_nodata);
		out->scale = GDALGetRasterScale(b, &out->has_scale);
		out->offset = GDALGetRasterOffset(b, &out->has_offset);
		out->type = CPLStrdup(GDALGetDataTypeName(GDALGetRasterDataType(b)));
		out->unit = CPLStrdup(GDALGetRasterUnitType(b));
		out->description = CPLStrdup(GDALGetDescription(b));
	}
	lw_end();
	return b != NULL;
}

int lw_band_read(void *dataset, int band, int x, int y, int w, int h, double *values, uint8_t *valid, lw_log *log) {
	lw_begin(log);
	GDALRasterBandH b = GDALGetRasterBand(dataset, band);
	int ok = b && GDALRasterIO(b, GF_Read, x, y, w, h, values, w, h, GDT_Float64, 0, 0) == CE_None;
	if (ok && valid) {
		if (GDALGetMaskFlags(b) & GMF_ALL_VALID) {
			memset(valid, 1, (size_t)w * (size_t)h);
		} else {
			ok = GDALRasterIO(GDALGetMaskBand(b), GF_Read, x, y, w, h, valid, w, h, GDT_Byte, 0, 0) == CE_None;
		}
	}
	lw_end();
	return ok;
}

// ---- vector layers

int lw_layer_describe(void *dataset, int layer, lw_layer *out, lw_log *log) {
	lw_begin(log);
	memset(out, 0, sizeof *out);
	OGRLayerH l = GDALDatasetGetLayer(dataset, layer);
	if (l) {
		out->name = CPLStrdup(OGR_L_GetName(l));
		out->crs = lw_wkt(OGR_L_GetSpatialRef(l));
		out->count = OGR_L_GetFeatureCount(l, 0);
		OGRFeatureDefnH def = OGR_L_GetLayerDefn(l);
		int n = OGR_FD_GetFieldCount(def);
		size_t size = 1;
		for (int i = 0; i < n; i++) size += strlen(OGR_Fld_GetNameRef(OGR_FD_GetFieldDefn(def, i))) + 4;
		char *at = out->fields = CPLCalloc(1, size);
		for (int i = 0; i < n; i++) {
			OGRFieldDefnH field = OGR_FD_GetFieldDefn(def, i);
			OGRFieldType type = OGR_Fld_GetType(field);
			char kind = type == OFTInteger || type == OFTInteger64 ? 'i' : type == OFTReal ? 'f' : 's';
			at += sprintf(at, "%s\n%c\n", OGR_Fld_GetNameRef(field), kind);
		}
	}
	lw_end();
	return l != NULL;
}

static int append(lw_features *out, size_t *cap, const void *data, size_t n) {
	if (out->len + n > *cap) {
		size_t grow = (out->len + n) * 2;
		uint8_t *p = VSIRealloc(out->data, grow);
		if (!p) return 0;
		out->data = p;
		*cap = grow;
	}
	memcpy(out->data + out->len, data, n);
	out->len += n;
	return 1;
}

static int append_sized(lw_features *out, size_t *cap, const void *data, size_t n) {
	uint64_t size = n;
	return append(out, cap, &size, sizeof size) && append(out, cap, data, n);
}

// A feature goes over as: id, sized WKB, then per field a tag (0 for null) and
// eight bytes or a sized string, in the machine's byte order.
static int append_feature(lw_features *out, size_t *cap, OGRFeatureH f) {
	int64_t id = OGR_F_GetFID(f);
	if (!append(out, cap, &id, sizeof id)) return 0;
	OGRGeometryH g = OGR_F_GetGeometryRef(f);
	size_t size = g ? (size_t)OGR_G_WkbSize(g) : 0;
	uint8_t *wkb = size ? VSIMalloc(size) : NULL;
	if (size && (!wkb || OGR_G_ExportToIsoWkb(g, wkbNDR, wkb) != OGRERR_NONE)) {
		VSIFree(wkb);
		return 0;
	}
	int ok = append_sized(out, cap, wkb ? wkb : (const uint8_t *)"", size);
	VSIFree(wkb);
	int n = OGR_F_GetFieldCount(f);
	for (int i = 0; ok && i < n; i++) {
		OGRFieldType type = OGR_Fld_GetType(OGR_F_GetFieldDefnRef(f, i));
		if (!OGR_F_IsFieldSetAndNotNull(f, i)) {
			ok = append(out, cap, "\0", 1);
		} else if (type == OFTInteger || type == OFTInteger64) {
			int64_t v = OGR_F_GetFieldAsInteger64(f, i);
			ok = append(out, cap, "i", 1) && append(out, cap, &v, sizeof v);
		} else if (type == OFTReal) {
			double v = OGR_F_GetFieldAsDouble(f, i);
			ok = append(out, cap, "f", 1) && append(out, cap, &v, sizeof v);
		} else {
			const char *s = OGR_F_GetFieldAsString(f, i);
			ok = append(out, cap, "s", 1) && append_sized(out, cap, s, strlen(s));
		}
	}
	return ok;
}

int lw_layer_read(void *dataset, int layer, int rewind, int max, lw_features *out, lw_log *log) {
	lw_begin(log);
	memset(out, 0, sizeof *out);
	size_t cap = 0;
	OGRLayerH l = GDALDatasetGetLayer(dataset, layer);
	int ok = l != NULL;
	if (ok && rewind) OGR_L_ResetReading(l);
	while (ok && out->count < max) {
		OGRFeatureH f = OGR_L_GetNextFeature(l);
		if (!f) break;
		ok = append_feature(out, &cap, f);
		OGR_F_Destroy(f);
		out->count++;
	}
	lw_end();
	return ok && log->failures == 0;
}
