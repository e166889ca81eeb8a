// tests/bench/bench_broad_cgal.cpp: see bench_broad_anchors.h.
#include <CGAL/box_intersection_d.h>

#include <cstddef>
#include <vector>

#include "bench_broad_anchors.h"

extern "C" size_t cgal_pairs(const rdl_box *boxes, size_t count, size_t cutoff)
{
    typedef CGAL::Box_intersection_d::Box_d<float, 3, CGAL::Box_intersection_d::ID_EXPLICIT> box_type;
    std::vector<box_type> list;
    list.reserve(count);
    for (size_t i = 0; i < count; i++)
        list.emplace_back(const_cast<float *>(boxes[i].lo), const_cast<float *>(boxes[i].hi));
    size_t pairs = 0;
    CGAL::box_self_intersection_d(list.begin(), list.end(), [&pairs](const box_type &, const box_type &) { pairs++; },
                                  static_cast<std::ptrdiff_t>(cutoff));
    return pairs;
}
