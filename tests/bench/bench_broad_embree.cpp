// tests/bench/bench_broad_embree.cpp: see bench_broad_anchors.h.
#include <embree3/rtcore.h>

#include <atomic>
#include <cstdio>
#include <new>

#include "bench_broad_anchors.h"

namespace {

struct embree_tree {
    RTCDevice device;
    RTCScene scene;
    RTCGeometry geometry;
    const rdl_box *boxes;
    int mode;
    bool built;
    std::atomic<size_t> ordered;
};

void give_bounds(const RTCBoundsFunctionArguments *arguments)
{
    const rdl_box &box = static_cast<const embree_tree *>(arguments->geometryUserPtr)->boxes[arguments->primID];
    RTCBounds *out = arguments->bounds_o;
    out->lower_x = box.lo[0];
    out->lower_y = box.lo[1];
    out->lower_z = box.lo[2];
    out->upper_x = box.hi[0];
    out->upper_y = box.hi[1];
    out->upper_z = box.hi[2];
}

bool overlap(const rdl_box &a, const rdl_box &b)
{
    return a.lo[0] <= b.hi[0] && b.lo[0] <= a.hi[0] && a.lo[1] <= b.hi[1] && b.lo[1] <= a.hi[1] && a.lo[2] <= b.hi[2] &&
           b.lo[2] <= a.hi[2];
}

// Refitted trees have leaves of several boxes, whose pairs come untested.
void count_collisions(void *user, RTCCollision *collisions, unsigned count)
{
    const embree_tree *tree = static_cast<const embree_tree *>(user);
    size_t ordered = 0;
    for (unsigned i = 0; i < count; i++) {
        const unsigned a = collisions[i].primID0, b = collisions[i].primID1;
        ordered += a < b && (tree->mode != 3 || overlap(tree->boxes[a], tree->boxes[b]));
    }
    static_cast<embree_tree *>(user)->ordered += ordered;
}

} // namespace

extern "C" void *embree_open(const rdl_box *boxes, size_t count, unsigned threads, int mode)
{
    embree_tree *tree = new (std::nothrow) embree_tree;
    if (tree == nullptr)
        return nullptr;
    char config[64];
    std::snprintf(config, sizeof config, "threads=%u,set_affinity=0", threads);
    tree->device = rtcNewDevice(config);
    tree->boxes = boxes;
    tree->mode = mode;
    tree->built = false;
    tree->scene = rtcNewScene(tree->device);
    const RTCBuildQuality quality = mode == 0 ? RTC_BUILD_QUALITY_LOW : mode == 2 ? RTC_BUILD_QUALITY_HIGH
                                                                               : RTC_BUILD_QUALITY_MEDIUM;
    // Only low-quality scenes keep one tree per geometry, and only such a tree can be refitted.
    rtcSetSceneBuildQuality(tree->scene, mode == 3 ? RTC_BUILD_QUALITY_LOW : quality);
    rtcSetSceneFlags(tree->scene, mode == 2 ? RTC_SCENE_FLAG_NONE : RTC_SCENE_FLAG_DYNAMIC);
    tree->geometry = rtcNewGeometry(tree->device, RTC_GEOMETRY_TYPE_USER);
    rtcSetGeometryBuildQuality(tree->geometry, mode == 3 ? RTC_BUILD_QUALITY_REFIT : quality);
    rtcSetGeometryUserPrimitiveCount(tree->geometry, static_cast<unsigned>(count));
    rtcSetGeometryUserData(tree->geometry, tree);
    rtcSetGeometryBoundsFunction(tree->geometry, give_bounds, nullptr);
    rtcAttachGeometry(tree->scene, tree->geometry);
    embree_update(tree, boxes);
    return tree;
}

extern "C" void embree_update(void *embree, const rdl_box *boxes)
{
    embree_tree *tree = static_cast<embree_tree *>(embree);
    tree->boxes = boxes;
    rtcCommitGeometry(tree->geometry);
    rtcCommitScene(tree->scene);
}

extern "C" size_t embree_pairs(void *embree)
{
    embree_tree *tree = static_cast<embree_tree *>(embree);
    tree->ordered = 0;
    rtcCollide(tree->scene, tree->scene, count_collisions, tree);
    return tree->ordered;
}

extern "C" void embree_close(void *embree)
{
    embree_tree *tree = static_cast<embree_tree *>(embree);
    rtcReleaseGeometry(tree->geometry);
    rtcReleaseScene(tree->scene);
    rtcReleaseDevice(tree->device);
    delete tree;
}
