// Reads points, one "x y z" a line, from standard input, and writes CGAL's
// approximate ellipsoid of least volume around them, {p : pᵀMp + pᵀm + s <= 0},
// as the six elements of M (xx xy xz yy yz zz), the three of m, and s. It is
// computed to CGAL's epsilon of 1e-6.
#include <CGAL/Approximate_min_ellipsoid_d.h>
#include <CGAL/Approximate_min_ellipsoid_d_traits_d.h>
#include <CGAL/Cartesian_d.h>
#include <CGAL/MP_Float.h>

#include <cstdio>
#include <vector>

typedef CGAL::Cartesian_d<double> Kernel;
typedef CGAL::Approximate_min_ellipsoid_d_traits_d<Kernel, CGAL::MP_Float> Traits;

int main() {
	std::vector<Kernel::Point_d> points;
	double p[3];
	while (std::scanf("%lf %lf %lf", p, p + 1, p + 2) == 3)
		points.push_back(Kernel::Point_d(3, p, p + 3));
	CGAL::Approximate_min_ellipsoid_d<Traits> e(1e-6, points.begin(), points.end());
	if (!e.is_full_dimensional())
		return 1;
	for (int i = 0; i < 3; i++)
		for (int j = i; j < 3; j++)
			std::printf("%.17g ", e.defining_matrix(i, j));
	for (int i = 0; i < 3; i++)
		std::printf("%.17g ", e.defining_vector(i));
	// CGAL leaves the right-hand side, 4·(1 + achieved epsilon), to the caller.
	std::printf("%.17g\n", e.defining_scalar() - 4 * (1 + e.achieved_epsilon()));
}
