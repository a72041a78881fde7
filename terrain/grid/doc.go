// Package grid reads elevation grids - GeoTIFF, ASCII grids, VRT, and whatever
// else the installed GDAL opens - as surveys of one point per cell.
//
// Cells are read block by block in the order in which the file stores them, so
// memory does not grow with the raster. A cell without data gives no point.
package grid
