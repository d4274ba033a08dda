#include "tools/urdf/document.h"

#include <tinyxml.h>

#include <charconv>
#include <cmath>
#include <cstring>

#include "proto/files/words.h"

namespace pastern::tools {
namespace {

constexpr int kDeepest = 100;  // the XML library reads elements by recursion
constexpr std::size_t kLongestShown = 60;

/// Numbers of an attribute, separated by blanks; nothing unless they are `count`, all finite.
std::optional<std::vector<double>> numbers(const std::string& text, std::size_t count) {
  std::vector<double> found;
  const char* at = text.data();
  const char* end = at + text.size();
  while (true) {
    while (at != end && std::strchr(" \t\r\n", *at) != nullptr) ++at;
    if (at == end) break;
    if (*at == '+') ++at;
    double value = 0;
    const auto [next, error] = std::from_chars(at, end, value);
    const bool apart = next == end || std::strchr(" \t\r\n", *next) != nullptr;
    if (error != std::errc() || !apart || !std::isfinite(value)) return std::nullopt;
    found.push_back(value);
    at = next;
  }
  if (found.size() != count) return std::nullopt;
  return found;
}

std::string attribute(const TiXmlElement& element, const char* name) {
  const char* text = element.Attribute(name);
  return text == nullptr ? std::string() : std::string(text);
}

/// Deepest nesting of elements; comments, declarations and quoted attributes left out.
int depth_of(const std::string& text) {
  int depth = 0;
  int deepest = 0;
  for (std::size_t at = text.find('<'); at != std::string::npos; at = text.find('<', at)) {
    if (text.compare(at, 4, "<!--") == 0) {
      at = text.find("-->", at);
      if (at == std::string::npos) break;
      continue;
    }
    const char kind = at + 1 < text.size() ? text[at + 1] : '\0';
    std::size_t end = at + 1;
    char quote = '\0';
    for (; end < text.size() && (quote != '\0' || text[end] != '>'); ++end) {
      if (quote == '\0' && (text[end] == '"' || text[end] == '\'')) {
        quote = text[end];
      } else if (text[end] == quote) {
        quote = '\0';
      }
    }
    if (kind == '/') {
      --depth;
    } else if (kind != '!' && kind != '?' && (end == 0 || text[end - 1] != '/')) {
      ++depth;
    }
    deepest = std::max(deepest, depth);
    at = end;
  }
  return deepest;
}

class Reader {
 public:
  Reader(const std::string& path, files::Defects& defects) : path_(path), defects_(defects) {}

  void link(const TiXmlElement& element, UrdfDocument& document) {
    LinkSaid said;
    said.name = attribute(element, "name");
    said.line = element.Row();
    if (said.name.empty()) add(field_of(said), "no name", "a name");
    said.has_shape =
        element.FirstChildElement("visual") != nullptr || element.FirstChildElement("collision") != nullptr;
    if (const TiXmlElement* inertial = element.FirstChildElement("inertial")) {
      said.has_inertial = true;
      mass_of(*inertial, said);
      inertia_of(*inertial, said);
    }
    document.links.push_back(said);
  }

  void joint(const TiXmlElement& element, UrdfDocument& document) {
    JointSaid said;
    said.name = attribute(element, "name");
    said.line = element.Row();
    if (said.name.empty()) add(field_of(said), "no name", "a name");
    said.type = attribute(element, "type");
    if (const TiXmlElement* parent = element.FirstChildElement("parent"))
      said.parent = attribute(*parent, "link");
    if (const TiXmlElement* child = element.FirstChildElement("child"))
      said.child = attribute(*child, "link");
    said.mimic = element.FirstChildElement("mimic") != nullptr;
    const std::string field = field_of(said);
    said.axis = std::array<double, 3>{1, 0, 0};  // URDF's own default
    if (const TiXmlElement* axis = element.FirstChildElement("axis")) {
      const auto three = numbers(attribute(*axis, "xyz"), 3);
      if (three) said.axis = {(*three)[0], (*three)[1], (*three)[2]};
      if (!three) said.axis.reset(), wrong(field + " axis", attribute(*axis, "xyz"), "three finite numbers");
    }
    if (const TiXmlElement* limit = element.FirstChildElement("limit")) {
      said.has_limit = true;
      said.lower = figure(*limit, "lower", field + " limit");
      said.upper = figure(*limit, "upper", field + " limit");
      said.effort = figure(*limit, "effort", field + " limit");
      said.velocity = figure(*limit, "velocity", field + " limit");
    }
    if (const TiXmlElement* dynamics = element.FirstChildElement("dynamics")) {
      said.damping = figure(*dynamics, "damping", field + " dynamics");
      said.friction = figure(*dynamics, "friction", field + " dynamics");
    }
    document.joints.push_back(said);
  }

  void add(const std::string& field, const std::string& found, const std::string& expected) {
    defects_.push_back({path_, field, found, expected});
  }

 private:
  void wrong(const std::string& field, const std::string& text, const std::string& expected) {
    add(field, text.empty() ? "nothing" : "\"" + shown_name(text) + "\"", expected);
  }

  /// Nothing when it is not said, or no number (told).
  std::optional<double> figure(const TiXmlElement& element, const char* name, const std::string& field) {
    if (element.Attribute(name) == nullptr) return std::nullopt;
    const auto one = numbers(attribute(element, name), 1);
    if (one) return one->front();
    wrong(field + " " + name, attribute(element, name), "a finite number");
    return std::nullopt;
  }

  void mass_of(const TiXmlElement& inertial, LinkSaid& said) {
    const TiXmlElement* mass = inertial.FirstChildElement("mass");
    if (mass == nullptr || mass->Attribute("value") == nullptr) {
      add(field_of(said) + " mass", "nothing", "a mass above 0 (kg)");
      return;
    }
    said.mass = figure(*mass, "value", field_of(said) + " mass");
  }

  void inertia_of(const TiXmlElement& inertial, LinkSaid& said) {
    const TiXmlElement* inertia = inertial.FirstChildElement("inertia");
    if (inertia == nullptr) {
      add(field_of(said) + " inertia", "nothing", "ixx, iyy, izz, ixy, ixz, iyz (kg m2)");
      return;
    }
    std::array<double, 6> six{};
    std::size_t sound = 0;
    const std::array<const char*, 6> names{"ixx", "iyy", "izz", "ixy", "ixz", "iyz"};
    for (std::size_t i = 0; i < names.size(); ++i) {
      if (inertia->Attribute(names[i]) == nullptr) {
        add(field_of(said) + " inertia " + names[i], "nothing", "a finite number");
        continue;
      }
      const auto one = figure(*inertia, names[i], field_of(said) + " inertia");
      if (!one) continue;
      six[i] = *one;
      ++sound;
    }
    if (sound == names.size()) said.inertia = six;
  }

  const std::string& path_;
  files::Defects& defects_;
};

std::string field(const char* kind, const std::string& name, int line) {
  return std::string(kind) + " " + (name.empty() ? "without a name" : shown_name(name)) + " (line " +
         std::to_string(line) + ")";
}

}  // namespace

std::string shown_name(const std::string& name) {
  std::string shown = name.substr(0, kLongestShown);
  const bool cut = name.size() > kLongestShown;
  if (!files::printable(shown, false)) {
    for (char& c : shown) {
      if (c < 0x20 || c > 0x7e) c = '?';
    }
  }
  return cut ? shown + "..." : shown;
}

std::string field_of(const LinkSaid& link) { return field("link", link.name, link.line); }
std::string field_of(const JointSaid& joint) { return field("joint", joint.name, joint.line); }

std::optional<UrdfDocument> read_document(const std::string& text, const std::string& path,
                                          files::Defects& defects) {
  Reader reader(path, defects);
  if (text.find('\0') != std::string::npos) {
    reader.add("", "a zero byte", "XML text");
    return std::nullopt;
  }
  if (depth_of(text) > kDeepest) {
    reader.add("", "elements nested deeper than 100", "a URDF document");
    return std::nullopt;
  }
  TiXmlDocument xml;
  xml.Parse(text.c_str(), nullptr, TIXML_ENCODING_UTF8);
  if (xml.Error()) {
    const std::string where = xml.ErrorRow() > 0 ? "line " + std::to_string(xml.ErrorRow()) : "";
    reader.add(where, "no XML: " + shown_name(xml.ErrorDesc()), "well-formed XML");
    return std::nullopt;
  }
  const TiXmlElement* robot = xml.RootElement();
  if (robot == nullptr || robot->ValueStr() != "robot") {
    reader.add("", robot == nullptr ? "no element" : "an element " + shown_name(robot->ValueStr()),
               "an element robot");
    return std::nullopt;
  }
  if (robot->NextSiblingElement() != nullptr) {
    reader.add("line " + std::to_string(robot->NextSiblingElement()->Row()), "a second element at the top",
               "one");
    return std::nullopt;
  }
  UrdfDocument document;
  document.name = attribute(*robot, "name");
  for (const TiXmlElement* at = robot->FirstChildElement(); at != nullptr; at = at->NextSiblingElement()) {
    if (at->ValueStr() == "link") reader.link(*at, document);
    if (at->ValueStr() == "joint") reader.joint(*at, document);
  }
  return document;
}

}  // namespace pastern::tools
