// Union-find over node numbers.
#pragma once

#include <cstddef>
#include <numeric>
#include <utility>
#include <vector>

namespace unsoldered {

class DisjointSets {
 public:
  explicit DisjointSets(std::size_t count) : parent_(count) { std::iota(parent_.begin(), parent_.end(), 0); }

  int find(int element) {
    int root = element;
    while (parent_[static_cast<std::size_t>(root)] != root) root = parent_[static_cast<std::size_t>(root)];
    while (element != root) element = std::exchange(parent_[static_cast<std::size_t>(element)], root);
    return root;
  }

  void join(int a, int b) { parent_[static_cast<std::size_t>(find(a))] = find(b); }

  bool together(int a, int b) { return find(a) == find(b); }

 private:
  std::vector<int> parent_;
};

}  // namespace unsoldered
