// Reflection over the scenario's own fields: a new number can be drawn without a line here.
#include "proto/files/drawn.h"

namespace pastern::files {
namespace {

using google::protobuf::FieldDescriptor;
using google::protobuf::Message;

const FieldDescriptor* number_in(const google::protobuf::Descriptor& message, const std::string& name) {
  const FieldDescriptor* field = message.FindFieldByName(name);
  const bool sound =
      field != nullptr && !field->is_repeated() && field->cpp_type() == FieldDescriptor::CPPTYPE_DOUBLE;
  return sound ? field : nullptr;
}

/// "load_at_m.y": the place and the number in it.
struct Path {
  const FieldDescriptor* place{nullptr};
  const FieldDescriptor* number{nullptr};
};

Path path_of(const std::string& name) {
  const auto& scenario = *v1::Scenario::descriptor();
  const std::size_t dot = name.find('.');
  if (dot == std::string::npos) return {nullptr, number_in(scenario, name)};
  const FieldDescriptor* place = scenario.FindFieldByName(name.substr(0, dot));
  if (place == nullptr || place->is_repeated() || place->message_type() != v1::Xyz::descriptor()) return {};
  return {place, number_in(*v1::Xyz::descriptor(), name.substr(dot + 1))};
}

const v1::JointWear* wear_of(const v1::Scenario& scenario, const std::string& joint) {
  for (const auto& wear : scenario.wear()) {
    if (wear.joint() == joint) return &wear;
  }
  return nullptr;
}

v1::JointWear& made_wear(v1::Scenario& scenario, const std::string& joint) {
  for (auto& wear : *scenario.mutable_wear()) {
    if (wear.joint() == joint) return wear;
  }
  v1::JointWear& wear = *scenario.add_wear();
  wear.set_joint(joint);
  return wear;
}

}  // namespace

bool is_wear(const std::string& field) { return number_in(*v1::JointWear::descriptor(), field) != nullptr; }

bool is_number(const std::string& field) { return is_wear(field) || path_of(field).number != nullptr; }

bool is_fixed(const v1::Scenario& scenario, const std::string& field, const std::string& joint) {
  if (is_wear(field)) {
    const v1::JointWear* wear = wear_of(scenario, joint);
    return wear != nullptr &&
           wear->GetReflection()->HasField(*wear, wear->GetDescriptor()->FindFieldByName(field));
  }
  const Path path = path_of(field);
  const FieldDescriptor* said = path.place != nullptr ? path.place : path.number;
  return said != nullptr && scenario.GetReflection()->HasField(scenario, said);
}

void set_number(v1::Scenario& scenario, const std::string& field, const std::string& joint, double value) {
  if (is_wear(field)) {
    v1::JointWear& wear = made_wear(scenario, joint);
    wear.GetReflection()->SetDouble(&wear, wear.GetDescriptor()->FindFieldByName(field), value);
    return;
  }
  const Path path = path_of(field);
  const auto& reflection = *scenario.GetReflection();
  if (path.place == nullptr) return reflection.SetDouble(&scenario, path.number, value);
  const bool fresh = !reflection.HasField(scenario, path.place);
  auto& place = static_cast<v1::Xyz&>(*reflection.MutableMessage(&scenario, path.place));
  if (fresh) {
    place.set_x(0);
    place.set_y(0);
    place.set_z(0);
  }
  place.GetReflection()->SetDouble(&place, path.number, value);
}

}  // namespace pastern::files
