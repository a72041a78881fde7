#include "binding.h"

#include <math.h>
#include <stdatomic.h>
#include <stdio.h>
#include <string.h>

#include <cpl_conv.h>
#include <cpl_error.h>
#include <cpl_vsi.h>
#include <gdal.h>
#include <ogr_api.h>
#include <ogr_srs_api.h>
#include <proj.h>

// ---- coordinate reference systems

// The unit of the last axis of a CRS, which is the height of a vertical or
// three-dimensional one; OSR has no call for it.
static void last_axis_unit(PJ_CONTEXT *ctx, const PJ *crs, lw_crs *out) {
	PJ *cs = proj_crs_get_coordinate_system(ctx, crs);
	if (!cs) return;
	const char *unit = NULL;
	int n = proj_cs_get_axis_count(ctx, cs);
	if (n > 0 && proj_cs_get_axis_info(ctx, cs, n - 1, NULL, NULL, NULL, &out->vertical_factor, &unit, NULL, NULL) && unit) {
		out->vertical_unit = CPLStrdup(unit);
	}
	proj_destroy(cs);
}

static void describe_vertical(lw_crs *out) {
	PJ_CONTEXT *ctx = proj_context_create();
	proj_context_set_enable_network(ctx, 0);
	PJ *crs = proj_create(ctx, out->wkt);
	PJ *vertical = crs && out->compound ? proj_crs_get_sub_crs(ctx, crs, 1) : NULL;
	if (vertical) {
		out->vertical_name = CPLStrdup(proj_get_name(vertical));
		last_axis_unit(ctx, vertical, out);
	} else if (crs && out->three_d) {
		out->vertical_name = CPLStrdup("ellipsoidal height");
		last_axis_unit(ctx, crs, out);
	}
	proj_destroy(vertical);
	proj_destroy(crs);
	proj_context_destroy(ctx);
}

// "EPSG:32633", for a compound of two coded parts "EPSG:32633+5773", else NULL.
static char *authority_of(OGRSpatialReferenceH srs, int compound) {
	char text[64];
	const char *name = OSRGetAuthorityName(srs, NULL), *code = OSRGetAuthorityCode(srs, NULL);
	if (name && code) {
		snprintf(text, sizeof text, "%s:%s", name, code);
		return CPLStrdup(text);
	}
	if (compound) {
		const char *part = OSRIsProjected(srs) ? "PROJCS" : "GEOGCS";
		name = OSRGetAuthorityName(srs, part);
		code = OSRGetAuthorityCode(srs, part);
		const char *vname = OSRGetAuthorityName(srs, "VERT_CS"), *vcode = OSRGetAuthorityCode(srs, "VERT_CS");
		if (name && code && vname && vcode && strcmp(name, "EPSG") == 0 && strcmp(vname, "EPSG") == 0) {
			snprintf(text, sizeof text, "EPSG:%s+%s", code, vcode);
			return CPLStrdup(text);
		}
		return NULL;
	}
	// Old WKT and PROJ strings come without a code. At 70 PROJ has found one that
	// is equivalent in all but its name.
	const char *const same[] = {"CRITERION=EQUIVALENT_EXCEPT_AXIS_ORDER_GEOGCRS", NULL};
	int n = 0, *confidence = NULL;
	char *found = NULL;
	OGRSpatialReferenceH *matches = OSRIsLocal(srs) ? NULL : OSRFindMatches(srs, NULL, &n, &confidence);
	if (matches && n > 0 && confidence[0] >= 70 && OSRIsSameEx(srs, matches[0], same)) {
		name = OSRGetAuthorityName(matches[0], NULL);
		code = OSRGetAuthorityCode(matches[0], NULL);
		if (name && code) {
			snprintf(text, sizeof text, "%s:%s", name, code);
			found = CPLStrdup(text);
		}
	}
	OSRFreeSRSArray(matches);
	CPLFree(confidence);
	return found;
}

static int describe_crs(OGRSpatialReferenceH srs, lw_crs *out) {
	OSRSetAxisMappingStrategy(srs, OAMS_TRADITIONAL_GIS_ORDER);
	out->wkt = lw_wkt(srs);
	if (!out->wkt) return 0;
	out->handle = srs;
	out->projected = OSRIsProjected(srs);
	out->geographic = OSRIsGeographic(srs);
	out->compound = OSRIsCompound(srs);
	out->geocentric = OSRIsGeocentric(srs);
	out->local = OSRIsLocal(srs);
	out->three_d = !out->compound && !out->geocentric && OSRGetAxesCount(srs) == 3;
	out->utm_zone = OSRGetUTMZone(srs, &out->utm_north);
	const char *name = OSRGetName(srs);
	out->name = CPLStrdup(name ? name : "");
	out->authority = authority_of(srs, out->compound);
	char *unit = NULL;
	if (out->geographic) {
		out->linear_factor = 0;
	} else {
		out->linear_factor = OSRGetLinearUnits(srs, &unit);
		out->linear_unit = CPLStrdup(unit ? unit : "");
	}
	// An engineering CRS may have no PROJJSON; the text is a convenience.
	CPLPushErrorHandler(CPLQuietErrorHandler);
	OSRExportToPROJJSON(srs, &out->projjson, NULL);
	CPLPopErrorHandler();
	describe_vertical(out);
	return 1;
}

int lw_crs_parse(const char *text, lw_crs *out, lw_log *log) {
	lw_begin(log);
	memset(out, 0, sizeof *out);
	OGRSpatialReferenceH srs = OSRNewSpatialReference(NULL);
	int ok = OSRSetFromUserInput(srs, text) == OGRERR_NONE && describe_crs(srs, out);
	if (!ok) OSRDestroySpatialReference(srs);
	lw_end();
	return ok;
}

int lw_crs_horizontal(void *crs, lw_crs *out, lw_log *log) {
	lw_begin(log);
	memset(out, 0, sizeof *out);
	OGRSpatialReferenceH srs = OSRClone(crs);
	int ok = (!OSRIsCompound(srs) || OSRStripVertical(srs) == OGRERR_NONE) &&
		(OSRGetAxesCount(srs) != 3 || OSRIsGeocentric(srs) || OSRDemoteTo2D(srs, NULL) == OGRERR_NONE) && describe_crs(srs, out);
	if (!ok) OSRDestroySpatialReference(srs);
	lw_end();
	return ok;
}

void lw_crs_close(void *crs) { OSRDestroySpatialReference(crs); }

char *lw_crs_of_tiff(const uint8_t *tiff, size_t len, lw_log *log) {
	static atomic_ulong next;
	const char *const drivers[] = {"GTiff", NULL};
	char name[64], *wkt = NULL;
	lw_begin(log);
	snprintf(name, sizeof name, "/vsimem/ledgework-keys-%lu.tif", atomic_fetch_add(&next, 1));
	CPLSetThreadLocalConfigOption("GTIFF_REPORT_COMPD_CS", "YES");
	VSILFILE *file = VSIFileFromMemBuffer(name, (GByte *)tiff, len, 0);
	if (file) {
		VSIFCloseL(file);
		GDALDatasetH ds = GDALOpenEx(name, GDAL_OF_READONLY | GDAL_OF_RASTER | GDAL_OF_VERBOSE_ERROR, drivers, NULL, NULL);
		if (ds) {
			wkt = lw_wkt(GDALGetSpatialRef(ds));
			GDALClose(ds);
		}
		VSIUnlink(name);
	}
	CPLSetThreadLocalConfigOption("GTIFF_REPORT_COMPD_CS", NULL);
	lw_end();
	return wkt;
}

// ---- transforms

struct lw_transform {
	PJ_CONTEXT *ctx;
	PJ *op;
};

static void collect_proj(void *user, int level, const char *text) {
	lw_log *log = user;
	if (!log || level > PJ_LOG_ERROR) return;
	log->failures++;
	lw_note(log, text);
}

static lw_transform *transform_begin(lw_log *log) {
	lw_begin(log);
	lw_transform *t = CPLCalloc(1, sizeof *t);
	t->ctx = proj_context_create();
	proj_context_set_enable_network(t->ctx, 0);
	proj_log_level(t->ctx, PJ_LOG_ERROR);
	proj_log_func(t->ctx, log, collect_proj);
	return t;
}

static lw_transform *transform_end(lw_transform *t, lw_log *log) {
	int code = t->op ? 0 : proj_context_errno(t->ctx);
	if (code && log->len == 0) lw_note(log, proj_context_errno_string(t->ctx, code));
	proj_log_level(t->ctx, PJ_LOG_NONE);
	proj_log_func(t->ctx, NULL, collect_proj);
	if (!t->op) {
		lw_transform_close(t);
		t = NULL;
	}
	lw_end();
	return t;
}

lw_transform *lw_transform_new(const char *source, const char *target, lw_log *log) {
	lw_transform *t = transform_begin(log);
	PJ *from = proj_create(t->ctx, source), *to = from ? proj_create(t->ctx, target) : NULL;
	PJ *op = to ? proj_create_crs_to_crs_from_pj(t->ctx, from, to, NULL, NULL) : NULL;
	if (op) t->op = proj_normalize_for_visualization(t->ctx, op);
	proj_destroy(op);
	proj_destroy(to);
	proj_destroy(from);
	return transform_end(t, log);
}

lw_transform *lw_transform_pipeline(const char *pipeline, lw_log *log) {
	lw_transform *t = transform_begin(log);
	t->op = proj_create(t->ctx, pipeline);
	return transform_end(t, log);
}

void lw_transform_close(lw_transform *t) {
	proj_destroy(t->op);
	proj_context_destroy(t->ctx);
	CPLFree(t);
}

int64_t lw_transform_apply(lw_transform *t, int inverse, double *x, double *y, double *z, int64_t n, int64_t *first, lw_log *log) {
	lw_begin(log);
	PJ_DIRECTION dir = inverse ? PJ_INV : PJ_FWD;
	// Whoever asks for degrees gets degrees: PROJ's own projections take radians.
	int in = proj_angular_input(t->op, dir), out = proj_angular_output(t->op, dir);
	int64_t failed = 0;
	for (int64_t i = 0; i < n; i++) {
		PJ_COORD c = proj_coord(x[i], y[i], z ? z[i] : 0, HUGE_VAL);
		if (in) {
			c.lp.lam = proj_torad(c.lp.lam);
			c.lp.phi = proj_torad(c.lp.phi);
		}
		c = proj_trans(t->op, dir, c);
		if (out) {
			c.lp.lam = proj_todeg(c.lp.lam);
			c.lp.phi = proj_todeg(c.lp.phi);
		}
		if (!isfinite(c.xyz.x) || !isfinite(c.xyz.y) || !isfinite(c.xyz.z)) {
			if (failed++ == 0) {
				int code = proj_errno(t->op);
				*first = i;
				if (code) lw_note(log, proj_context_errno_string(t->ctx, code));
			}
			proj_errno_reset(t->op);
			c = proj_coord(INFINITY, INFINITY, INFINITY, 0);
		}
		x[i] = c.xyz.x;
		y[i] = c.xyz.y;
		if (z) z[i] = c.xyz.z;
	}
	lw_end();
	return failed;
}

char *lw_transform_describe(lw_transform *t, double *accuracy, int *ballpark, lw_log *log) {
	lw_begin(log);
	PJ *used = NULL;
#if PROJ_VERSION_MAJOR > 9 || (PROJ_VERSION_MAJOR == 9 && PROJ_VERSION_MINOR >= 1)
	used = proj_trans_get_last_used_operation(t->op);
#endif
	PJ *op = used ? used : t->op;
	*accuracy = proj_coordoperation_get_accuracy(t->ctx, op);
	*ballpark = proj_coordoperation_has_ballpark_transformation(t->ctx, op);
	const char *text = proj_pj_info(op).description;
	char *copy = CPLStrdup(text ? text : "");
	proj_destroy(used);
	lw_end();
	return copy;
}

// ---- geometries

int lw_geometry(int what, const uint8_t *wkb, size_t len, double *number, uint8_t **out, size_t *out_len, lw_log *log) {
	lw_begin(log);
	OGRGeometryH g = NULL, made = NULL;
	int ok = OGR_G_CreateFromWkbEx(wkb, NULL, &g, len) == OGRERR_NONE && g;
	if (ok) {
		switch (what) {
		case LW_VALID: *number = OGR_G_IsValid(g); break;
		case LW_AREA: *number = OGR_G_Area(g); break;
		case LW_MAKE_VALID: made = OGR_G_MakeValid(g); break;
		case LW_UNION:
			g = OGR_G_ForceToMultiPolygon(g);
			made = OGR_G_UnionCascaded(g);
			break;
		}
	}
	if (ok && out) {
		ok = made != NULL;
		if (ok) {
			*out_len = (size_t)OGR_G_WkbSize(made);
			*out = VSIMalloc(*out_len);
			ok = *out && OGR_G_ExportToIsoWkb(made, wkbNDR, *out) == OGRERR_NONE;
		}
	}
	OGR_G_DestroyGeometry(made);
	OGR_G_DestroyGeometry(g);
	lw_end();
	return ok;
}
