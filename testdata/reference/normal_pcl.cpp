// Reads points, one "x y z" a line, from standard input, and writes what the
// Point Cloud Library makes of them all as one neighbourhood: the smallest
// eigenvalue, the trace, the normal and the centroid.
#define PCL_NO_PRECOMPILE
#include <pcl/point_types.h>
#include <pcl/point_cloud.h>
#include <pcl/common/centroid.h>
#include <pcl/common/eigen.h>

#include <cstdio>

int main() {
	pcl::PointCloud<pcl::PointXYZ> cloud;
	double x, y, z;
	while (std::scanf("%lf %lf %lf", &x, &y, &z) == 3)
		cloud.push_back(pcl::PointXYZ(float(x), float(y), float(z)));
	Eigen::Matrix3d covariance;
	Eigen::Vector4d centroid;
	if (pcl::computeMeanAndCovarianceMatrix(cloud, covariance, centroid) == 0)
		return 1;
	double smallest;
	Eigen::Vector3d normal;
	pcl::eigen33(covariance, smallest, normal);
	std::printf("%.17g %.17g %.17g %.17g %.17g %.17g %.17g %.17g\n", smallest, covariance.trace(),
		normal[0], normal[1], normal[2], centroid[0], centroid[1], centroid[2]);
}
