// A robot of our own invention as URDF: a trunk of two parts, two legs of two hinges, a tail that slides.
// Joint frames are turned every way; a foot and a sensor are fixed links.
#pragma once

#include <gtest/gtest.h>

#include <string>

#include "tools/urdf/urdf_file.h"

namespace pastern::testing {

inline std::string stilt() {
  return R"(<?xml version="1.0"?>
<robot name="stilt">
  <link name="deck">
    <inertial><origin xyz="0.01 0 0.02"/><mass value="4"/>
      <inertia ixx="0.03" iyy="0.05" izz="0.06" ixy="0.001" ixz="0" iyz="-0.002"/></inertial>
    <visual><geometry><box size="0.4 0.2 0.1"/></geometry></visual>
  </link>
  <link name="mast">
    <inertial><origin xyz="0 0 0.1" rpy="0 0 0.5"/><mass value="1"/>
      <inertia ixx="0.004" iyy="0.005" izz="0.002" ixy="0" ixz="0" iyz="0"/></inertial>
  </link>
  <joint name="mast_mount" type="fixed">
    <origin xyz="-0.1 0 0.05" rpy="0.3 -0.2 0.1"/><parent link="deck"/><child link="mast"/></joint>
  <link name="left_thigh">
    <inertial><origin xyz="0.02 0 -0.1" rpy="0.1 0.2 0.3"/><mass value="0.8"/>
      <inertia ixx="0.004" iyy="0.0042" izz="0.0009" ixy="0.0001" ixz="0" iyz="0"/></inertial>
  </link>
  <joint name="left_hip" type="revolute">
    <origin xyz="0.15 0.1 0" rpy="0.4 0.1 -0.3"/><parent link="deck"/><child link="left_thigh"/>
    <axis xyz="0 2 0"/><limit lower="-1" upper="2" effort="30" velocity="12"/><dynamics damping="0.1" friction="0.3"/></joint>
  <link name="left_shank">
    <inertial><origin xyz="0 0 -0.1"/><mass value="0.3"/>
      <inertia ixx="0.001" iyy="0.001" izz="0.0001" ixy="0" ixz="0" iyz="0"/></inertial>
  </link>
  <joint name="left_knee" type="continuous">
    <origin xyz="0 0 -0.22" rpy="0 0 1.2"/><parent link="left_thigh"/><child link="left_shank"/><axis xyz="1 1 0"/></joint>
  <link name="left_foot"/>
  <joint name="left_sole" type="fixed">
    <origin xyz="0 0 -0.21" rpy="0.2 0 0"/><parent link="left_shank"/><child link="left_foot"/></joint>
  <link name="right_thigh">
    <inertial><mass value="0.8"/><inertia ixx="0.004" iyy="0.0042" izz="0.0009" ixy="0" ixz="0" iyz="0"/></inertial>
  </link>
  <joint name="right_hip" type="revolute">
    <origin xyz="0.15 -0.1 0"/><parent link="deck"/><child link="right_thigh"/>
    <axis xyz="0 1 0"/><limit lower="-1" upper="2" effort="30" velocity="12"/></joint>
  <link name="tail">
    <inertial><mass value="0.5"/><inertia ixx="0.001" iyy="0.001" izz="0.001" ixy="0" ixz="0" iyz="0"/></inertial>
  </link>
  <joint name="tail_slide" type="prismatic">
    <origin xyz="0 0 0.1" rpy="0 0.5 0"/><parent link="mast"/><child link="tail"/>
    <axis xyz="1 0 0"/><limit lower="-0.1" upper="0.2" effort="50" velocity="1"/></joint>
</robot>
)";
}

/// The same with one text in another's place.
inline std::string stilt_with(const std::string& from, const std::string& to) {
  std::string text = stilt();
  const std::size_t at = text.find(from);
  EXPECT_NE(at, std::string::npos) << from;
  return text.replace(at, from.size(), to);
}

/// The lines of its defects.
inline std::string refused(const std::string& text) {
  files::Defects defects;
  const auto made = tools::parse_urdf(text, "stilt.urdf", defects);
  EXPECT_EQ(made.has_value(), defects.empty());
  return files::lines(defects);
}

}  // namespace pastern::testing
