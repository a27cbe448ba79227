#include "engine/sequence/islands.hpp"

#include <algorithm>
#include <cmath>
#include <numeric>

namespace kiloamp::detail {

namespace {
// Ratios are products of a few nameplate voltages; a loop closes within round-off or not at all.
constexpr double kLoopRatioTolerance = 1e-9;
}  // namespace

Islands::Islands(std::size_t nodes)
    : parent_(nodes), ratio_(nodes, 1.0), size_(nodes, 1), marked_(nodes, false) {
  std::iota(parent_.begin(), parent_.end(), std::size_t{0});
}

Islands::Found Islands::find(std::size_t n) const {
  std::size_t root = n;
  double ratio = 1.0;
  while (parent_[root] != root) {
    ratio *= ratio_[root];
    root = parent_[root];
  }
  double left = ratio;
  while (parent_[n] != root && n != root) {  // compress the path
    const std::size_t next = parent_[n];
    const double own = ratio_[n];
    parent_[n] = root;
    ratio_[n] = left;
    left /= own;
    n = next;
  }
  return {root, ratio};
}

void Islands::join(Node a, Node b, double ratio) {
  Found fa = find(at(a)), fb = find(at(b));
  if (fa.root == fb.root) {
    if (std::abs(fa.ratio * ratio / fb.ratio - 1.0) > kLoopRatioTolerance) marked_[fa.root] = true;
    return;
  }
  double root_ratio = ratio * fa.ratio / fb.ratio;  // v_root(b) / v_root(a)
  if (size_[fa.root] < size_[fb.root]) {
    std::swap(fa, fb);
    root_ratio = 1.0 / root_ratio;
  }
  parent_[fb.root] = fa.root;
  ratio_[fb.root] = root_ratio;
  size_[fa.root] += size_[fb.root];
  if (marked_[fb.root]) marked_[fa.root] = true;
}

void Islands::mark(Node n) { marked_[find(at(n)).root] = true; }
bool Islands::is_marked(Node n) const { return marked_[find(at(n)).root]; }

std::vector<Node> Islands::unmarked_representatives() const {
  std::vector<Node> nodes;
  for (std::size_t n = 0; n < parent_.size(); ++n)
    if (parent_[n] == n && !marked_[n]) nodes.push_back(static_cast<Node>(n));
  return nodes;
}

namespace {

struct Spanning {
  std::vector<std::int64_t> parent_link;  // -1 at a root
  std::vector<std::uint32_t> depth;
};

// Elements on the loop that `closing` makes with the tree.
std::vector<ElementRef> loop_elements(const Spanning& tree, const std::vector<Link>& links,
                                      const Link& closing) {
  std::vector<ElementRef> left, right;
  auto a = at(closing.from), b = at(closing.to);
  const auto step = [&](std::size_t& n, std::vector<ElementRef>& trail) {
    const Link& link = links[static_cast<std::size_t>(tree.parent_link[n])];
    trail.push_back(link.element);
    n = at(link.from) == n ? at(link.to) : at(link.from);
  };
  while (a != b) {
    if (tree.depth[a] >= tree.depth[b])
      step(a, left);
    else
      step(b, right);
  }
  left.insert(left.end(), right.rbegin(), right.rend());
  left.push_back(closing.element);
  left.erase(std::unique(left.begin(), left.end()), left.end());
  return left;
}

Finding loop_finding(const Network& network, const std::vector<ElementRef>& loop, int sum) {
  Finding finding;
  finding.element = loop.back();
  finding.field = "vector_group";
  for (const ElementRef ref : loop) {
    if (!finding.found.empty()) finding.found += ", ";
    finding.found += '"' + element(network, ref).id + '"';
    if (ref.kind == ElementKind::transformer)
      finding.found += " " + network.transformers[ref.index].vector_group.text;
    if (ref.kind == ElementKind::three_winding_transformer)
      finding.found += " " + network.three_winding_transformers[ref.index].vector_group.text;
  }
  finding.found =
      "loop of " + finding.found + ": phase shifts add up to " + std::to_string(30 * sum) + " degrees";
  finding.allowed = "phase shifts around a loop must add up to a multiple of 360 degrees";
  finding.remedy = "correct the clock number of one transformer of the loop, or open a switch in it";
  return finding;
}

}  // namespace

std::vector<std::uint8_t> lag_clocks(const Network& network, std::size_t nodes,
                                     const std::vector<Link>& links) {
  std::vector<std::uint32_t> start(nodes + 1, 0);
  for (const Link& link : links) {
    ++start[at(link.from)];
    ++start[at(link.to)];
  }
  std::exclusive_scan(start.begin(), start.end(), start.begin(), 0U);
  std::vector<std::uint32_t> incident(2 * links.size()), fill(start.begin(), start.end() - 1);
  for (std::uint32_t l = 0; l < links.size(); ++l) {
    incident[fill[at(links[l].from)]++] = l;
    incident[fill[at(links[l].to)]++] = l;
  }

  std::vector<std::uint8_t> lag(nodes, 0);
  Spanning tree{std::vector<std::int64_t>(nodes, -1), std::vector<std::uint32_t>(nodes, 0)};
  std::vector<bool> seen(nodes, false);
  std::vector<std::size_t> queue;
  queue.reserve(nodes);
  std::vector<Finding> findings;
  for (std::size_t root = 0; root < nodes; ++root) {
    if (seen[root]) continue;
    seen[root] = true;
    queue.assign(1, root);
    for (std::size_t head = 0; head < queue.size(); ++head) {
      const std::size_t n = queue[head];
      for (std::uint32_t k = start[n]; k < start[n + 1]; ++k) {
        const Link& link = links[incident[k]];
        const bool forward = at(link.from) == n;
        const std::size_t other = forward ? at(link.to) : at(link.from);
        const auto there = static_cast<std::uint8_t>((lag[n] + (forward ? link.lag : 12 - link.lag)) % 12);
        if (!seen[other]) {
          seen[other] = true;
          lag[other] = there;
          tree.parent_link[other] = incident[k];
          tree.depth[other] = tree.depth[n] + 1;
          queue.push_back(other);
        } else if (lag[other] != there && forward) {
          findings.push_back(
              loop_finding(network, loop_elements(tree, links, link), (there + 12 - lag[other]) % 12));
        }
      }
    }
  }
  if (!findings.empty()) throw NetworkError(std::move(findings));
  return lag;
}

}  // namespace kiloamp::detail
