// Layers and includes.
#include "tests/arch/rules.h"

#include <algorithm>
#include <map>
#include <regex>
#include <sstream>

namespace pastern::arch {

namespace {

bool starts_with(const std::string& text, const std::string& start) { return text.rfind(start, 0) == 0; }

std::string at(const Source& source, int line) { return source.path + ":" + std::to_string(line) + ": "; }

/// Headers that the build makes: those of messages, and those made from a template that lies in the tree.
bool is_message(const std::string& path) { return starts_with(path, "pastern/v1/"); }

bool exists(const Tree& tree, const std::string& path) {
  if (is_message(path)) {
    const std::size_t end = path.rfind(".pb.h");
    return end != std::string::npos && tree.has("proto/" + path.substr(0, end) + ".proto");
  }
  return tree.has(path) || tree.has(path + ".in");
}

std::string target_folder(const Layers& layers, const std::string& path) {
  return is_message(path) ? "proto" : folder_of(layers, path);
}

/// A circle of arrows, as "a -> b -> a", or empty.
std::string circle_from(const std::multimap<std::string, std::string>& arrows, const std::string& start) {
  std::vector<std::vector<std::string>> ways{{start}};
  std::set<std::string> seen;
  while (!ways.empty()) {
    const std::vector<std::string> way = ways.back();
    ways.pop_back();
    const auto [first, last] = arrows.equal_range(way.back());
    for (auto arrow = first; arrow != last; ++arrow) {
      std::vector<std::string> longer = way;
      longer.push_back(arrow->second);
      if (arrow->second == start) {
        std::string words;
        for (const std::string& folder : longer) {
          words += (words.empty() ? "" : " -> ") + folder;
        }
        return words;
      }
      if (seen.insert(arrow->second).second) {
        ways.push_back(longer);
      }
    }
  }
  return "";
}

}  // namespace

Layers read_layers(const std::string& text) {
  static const std::regex kArrow(R"(^([a-z_/]+)\s+->\s+([a-z_/]+)\s+:\s*(.*\S)\s*$)");
  Layers layers;
  std::set<std::pair<std::string, std::string>> seen;
  std::multimap<std::string, std::string> graph;
  std::istringstream lines(text);
  std::string line;
  for (int number = 1; std::getline(lines, line); ++number) {
    if (line.empty() || line[0] == '#') {
      continue;
    }
    std::smatch match;
    const std::string where = "layers.txt:" + std::to_string(number) + ": ";
    if (!std::regex_match(line, match, kArrow)) {
      layers.findings.push_back(where + "found \"" + line + "\", expected \"folder -> folder : reason\"");
      continue;
    }
    if (!seen.insert({match[1], match[2]}).second) {
      layers.findings.push_back(where + "the arrow " + match[1].str() + " -> " + match[2].str() +
                                " stands twice");
    }
    layers.arrows.push_back({match[1], match[2], match[3], number});
    layers.folders.insert({match[1], match[2]});
    graph.emplace(match[1], match[2]);
  }
  for (const std::string& folder : layers.folders) {
    if (const std::string circle = circle_from(graph, folder); !circle.empty()) {
      layers.findings.push_back("layers.txt: arrows in a circle: " + circle);
      break;
    }
  }
  return layers;
}

std::string folder_of(const Layers& layers, const std::string& path) {
  std::string best;
  for (const std::string& folder : layers.folders) {
    if (starts_with(path, folder + "/") && folder.size() > best.size()) {
      best = folder;
    }
  }
  return best;
}

Findings check_top_level(const Tree& tree) {
  static const std::set<std::string> kAllowed{"CMakeLists.txt", "README.md", "DEVELOPERS.md",
                                              "runtime",        "proto",     "hal_stub",
                                              "tests",          "tools",     "safety"};
  Findings findings;
  for (const std::string& name : tree.top) {
    if (name[0] != '.' && kAllowed.count(name) == 0) {
      findings.push_back(name + ": does not belong at the top level");
    }
  }
  return findings;
}

Findings check_includes(const Tree& tree, const Layers& layers) {
  std::set<std::pair<std::string, std::string>> allowed;
  for (const Arrow& arrow : layers.arrows) {
    allowed.insert({arrow.from, arrow.to});
  }
  Findings findings;
  for (const Source& source : tree.sources) {
    const bool is_test = starts_with(source.path, "tests/");
    const std::string from = folder_of(layers, source.path);
    if (from.empty() && !is_test) {
      findings.push_back(source.path + ": in no folder that layers.txt knows");
      continue;
    }
    for (const Include& include : source.includes) {
      if (!include.quoted) {
        continue;
      }
      if (!exists(tree, include.path)) {
        findings.push_back(at(source, include.line) + "found \"" + include.path +
                           "\", expected a path from the root of the tree");
        continue;
      }
      const std::string to = target_folder(layers, include.path);
      if (!is_test && to != from && allowed.count({from, to}) == 0) {
        findings.push_back(at(source, include.line) + from + " may not include \"" + include.path +
                           "\": no arrow to " + (to.empty() ? "its folder" : to));
      }
    }
  }
  return findings;
}

Findings check_arrows_used(const Tree& tree, const Layers& layers) {
  std::set<std::pair<std::string, std::string>> used;
  for (const Source& source : tree.sources) {
    for (const Include& include : source.includes) {
      if (include.quoted) {
        used.insert({folder_of(layers, source.path), target_folder(layers, include.path)});
      }
    }
  }
  Findings findings;
  for (const Arrow& arrow : layers.arrows) {
    if (used.count({arrow.from, arrow.to}) == 0) {
      findings.push_back("layers.txt:" + std::to_string(arrow.line) + ": no include line uses the arrow " +
                         arrow.from + " -> " + arrow.to);
    }
  }
  return findings;
}

}  // namespace pastern::arch
