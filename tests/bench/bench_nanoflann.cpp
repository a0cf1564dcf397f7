// SPDX-License-Identifier: GPL-3.0-or-later
// bench_nanoflann.cpp: the yardstick of bench_search: fixed-radius neighbours by nanoflann's
// k-d tree
//
// Usage: bench_nanoflann <file> <repetitions>; the file holds x, y, z, H of particles in the
// periodic unit cube. Images of particles near the faces are added before the clock starts.
// Each particle gets the list of all others within its own H. Prints processor seconds of build
// and search, least of the repetitions, and the count of neighbours.
#include <nanoflann.hpp>

#include <algorithm>
#include <array>
#include <cstdio>
#include <cstdlib>
#include <ctime>
#include <vector>

struct Places {
  std::vector<std::array<double, 3>> at;
  size_t kdtree_get_point_count() const { return at.size(); }
  double kdtree_get_pt(size_t i, size_t axis) const { return at[i][axis]; }
  template <class Box> bool kdtree_get_bbox(Box &) const { return false; }
};

// Keeps indices only.
struct List {
  std::vector<uint32_t> &out;
  const double r2;
  size_t size() const { return out.size(); }
  bool full() const { return true; }
  bool addPoint(double d, uint32_t i) {
    if (d < r2) out.push_back(i);
    return true;
  }
  double worstDist() const { return r2; }
};

using Tree = nanoflann::KDTreeSingleIndexAdaptor<nanoflann::L2_Simple_Adaptor<double, Places>,
                                                 Places, 3, uint32_t>;

static void add_images(Places &places, double reach) {
  for (int axis = 0; axis < 3; axis++) {
    const size_t n = places.at.size();
    for (size_t i = 0; i < n; i++)
      for (int side = -1; side <= 1; side += 2) {
        auto image = places.at[i];
        image[axis] += side;
        if (image[axis] > -reach && image[axis] < 1.0 + reach) places.at.push_back(image);
      }
  }
}

int main(int argc, char **argv) {
  FILE *file = argc > 2 ? std::fopen(argv[1], "rb") : nullptr;
  if (!file) return 1;
  Places places;
  std::vector<double> support;
  double p[4], reach = 0.0;
  while (std::fread(p, sizeof p, 1, file) == 1) {
    places.at.push_back({p[0], p[1], p[2]});
    support.push_back(p[3]);
    reach = std::max(reach, p[3]);
  }
  std::fclose(file);
  add_images(places, reach);
  double least = 1e300;
  size_t neighbours = 0;
  std::vector<uint32_t> out;
  out.reserve(64 * support.size());
  for (int k = 0; k < std::atoi(argv[2]); k++) {
    out.clear();
    const std::clock_t start = std::clock();
    Tree tree(3, places, nanoflann::KDTreeSingleIndexAdaptorParams(32));
    tree.buildIndex();
    for (size_t i = 0; i < support.size(); i++) {
      List list{out, support[i] * support[i]};
      tree.findNeighbors(list, places.at[i].data(), nanoflann::SearchParams());
    }
    least = std::min(least, double(std::clock() - start) / CLOCKS_PER_SEC);
    neighbours = out.size() - support.size();
  }
  std::printf("%.6f %.0f\n", least, double(neighbours));
  return 0;
}
