// The only source that sees DART. Its conventions: a free joint's coordinates are [rotation logarithm; world
// position], its speeds the body twist [angular; linear] in trunk axes, its accelerations the derivatives of
// those components.
#include "tests/external/multibody/reference.h"

#include <Eigen/Dense>
#include <cmath>
#include <dart/collision/dart/DARTCollisionDetector.hpp>
#include <dart/constraint/ConstraintSolver.hpp>
#include <dart/dynamics/BodyNode.hpp>
#include <dart/dynamics/BoxShape.hpp>
#include <dart/dynamics/FreeJoint.hpp>
#include <dart/dynamics/PrismaticJoint.hpp>
#include <dart/dynamics/RevoluteJoint.hpp>
#include <dart/dynamics/Skeleton.hpp>
#include <dart/dynamics/SphereShape.hpp>
#include <dart/dynamics/WeldJoint.hpp>
#include <dart/simulation/World.hpp>
#include <map>
#include <string>

namespace pastern::multibody {
namespace {

namespace dd = dart::dynamics;
using Vector3 = Eigen::Vector3d;

const Vector3 kGravity(0, 0, -9.80665);

Vector3 vec(const v1::Xyz& a) { return {a.x(), a.y(), a.z()}; }
Vector3 vec(const std::array<double, 3>& a) { return {a[0], a[1], a[2]}; }

dd::Inertia inertia_of(const v1::Link& link) {
  const auto& i = link.inertia();
  dd::Inertia made;
  made.setMass(link.mass_kg());
  made.setLocalCOM(vec(link.centre_of_mass_m()));
  made.setMoment(i.xx(), i.yy(), i.zz(), i.xy(), i.xz(), i.yz());
  return made;
}

template <class Kind>
std::pair<dd::Joint*, dd::BodyNode*> hang(dd::Skeleton& skeleton, dd::BodyNode* parent,
                                          const v1::Joint& joint) {
  typename Kind::Properties how;
  how.mName = joint.name();
  how.mAxis = vec(joint.axis()).normalized();
  how.mT_ParentBodyToJoint.translation() = vec(joint.origin_m());
  return skeleton.createJointAndBodyNodePair<Kind>(parent, how,
                                                   dd::BodyNode::AspectProperties(joint.name() + "_link"));
}

}  // namespace

struct Reference::Impl {
  dd::SkeletonPtr skeleton{dd::Skeleton::create("robot")};
  dd::FreeJoint* base{nullptr};
  dd::BodyNode* trunk{nullptr};
  std::vector<dd::Joint*> joint;
  std::map<std::string, dd::BodyNode*> link;  ///< by the joint that moves it
  std::vector<v1::Leg> legs;
  dart::simulation::WorldPtr world;
  Eigen::VectorXd forces;

  void put(const Motion& motion) {
    const auto& q = motion.attitude;
    Eigen::Isometry3d place = Eigen::Isometry3d::Identity();
    place.linear() = Eigen::Quaterniond(q[0], q[1], q[2], q[3]).toRotationMatrix();
    place.translation() = vec(motion.position);
    base->setPositions(dd::FreeJoint::convertToPositions(place));
    Eigen::Matrix<double, 6, 1> twist;
    twist << vec(motion.rate), place.linear().transpose() * vec(motion.velocity);
    base->setVelocities(twist);
    for (std::size_t j = 0; j < joint.size(); ++j) {
      joint[j]->setPosition(0, motion.angle[j]);
      joint[j]->setVelocity(0, motion.speed[j]);
    }
  }

  /// Component derivatives of the body twist -> acceleration of the trunk's origin: a = v' + rate x v.
  Accelerations told(const Motion& motion, const Eigen::VectorXd& all) const {
    const Vector3 rate = vec(motion.rate);
    const Vector3 v = base->getVelocities().tail<3>();
    Accelerations made;
    Eigen::Map<Vector3>(made.trunk.data()) = all.segment<3>(0);
    Eigen::Map<Vector3>(made.trunk.data() + 3) = all.segment<3>(3) + rate.cross(v);
    for (const dd::Joint* j : joint) made.joint.push_back(all[at(j)]);
    return made;
  }

  static Eigen::Index at(const dd::Joint* j) { return static_cast<Eigen::Index>(j->getIndexInSkeleton(0)); }
};

Reference::Reference(const v1::Robot& robot) : impl_(std::make_unique<Impl>()) {
  Impl& me = *impl_;
  me.skeleton->setGravity(kGravity);
  const auto trunk = me.skeleton->createJointAndBodyNodePair<dd::FreeJoint>(nullptr);
  me.base = trunk.first;
  me.trunk = trunk.second;
  me.trunk->setInertia(inertia_of(robot.trunk().link()));
  for (const v1::Joint& joint : robot.joints()) {
    dd::BodyNode* parent = joint.parent().empty() ? me.trunk : me.link.at(joint.parent());
    const auto made = joint.kind() == v1::Joint::PRISMATIC
                          ? hang<dd::PrismaticJoint>(*me.skeleton, parent, joint)
                          : hang<dd::RevoluteJoint>(*me.skeleton, parent, joint);
    made.second->setInertia(inertia_of(joint.link()));
    me.joint.push_back(made.first);
    me.link[joint.name()] = made.second;
  }
  me.legs.assign(robot.legs().begin(), robot.legs().end());
}

Reference::~Reference() = default;
Reference::Reference(Reference&&) noexcept = default;
Reference& Reference::operator=(Reference&&) noexcept = default;

Accelerations Reference::by_recursion(const Motion& motion, const Drives& drives) {
  Impl& me = *impl_;
  me.skeleton->setTimeStep(drives.step_s);
  me.put(motion);
  for (std::size_t j = 0; j < me.joint.size(); ++j) {
    const double rotor = drives.rotor[j] / drives.step_s;
    me.joint[j]->setDampingCoefficient(0, rotor + drives.viscosity[j]);
    me.joint[j]->setForce(0, drives.torque[j] + rotor * motion.speed[j]);
  }
  me.skeleton->computeForwardDynamics();
  return me.told(motion, me.skeleton->getAccelerations());
}

Accelerations Reference::by_mass_matrix(const Motion& motion, const Drives& drives) {
  Impl& me = *impl_;
  me.put(motion);
  Eigen::MatrixXd inertia = me.skeleton->getMassMatrix();
  Eigen::VectorXd force = -me.skeleton->getCoriolisAndGravityForces();
  for (std::size_t j = 0; j < me.joint.size(); ++j) {
    const Eigen::Index at = Impl::at(me.joint[j]);
    inertia(at, at) += drives.rotor[j] + drives.step_s * drives.viscosity[j];
    force[at] += drives.torque[j] - drives.viscosity[j] * motion.speed[j];
  }
  return me.told(motion, inertia.ldlt().solve(force));
}

void Reference::put_on_floor(double friction, double step_s) {
  Impl& me = *impl_;
  const auto floor = dd::Skeleton::create("floor");
  dd::BodyNode* slab = floor->createJointAndBodyNodePair<dd::WeldJoint>(nullptr).second;
  slab->createShapeNodeWith<dd::CollisionAspect, dd::DynamicsAspect>(
      std::make_shared<dd::BoxShape>(Vector3(20, 20, 1)));
  slab->getShapeNode(0)->setRelativeTranslation(Vector3(0, 0, -0.5));
  slab->getShapeNode(0)->getDynamicsAspect()->setFrictionCoeff(friction);
  for (const v1::Leg& leg : me.legs) {
    auto* ball = me.link.at(leg.knee())
                     ->createShapeNodeWith<dd::CollisionAspect, dd::DynamicsAspect>(
                         std::make_shared<dd::SphereShape>(leg.foot_radius_m()));
    ball->setRelativeTranslation(vec(leg.foot_m()));
    ball->getDynamicsAspect()->setFrictionCoeff(friction);
  }
  me.world = dart::simulation::World::create();
  me.world->getConstraintSolver()->setCollisionDetector(dart::collision::DARTCollisionDetector::create());
  me.world->setGravity(kGravity);
  me.world->setTimeStep(step_s);
  me.world->addSkeleton(floor);
  me.world->addSkeleton(me.skeleton);
  me.forces = Eigen::VectorXd::Zero(static_cast<Eigen::Index>(me.skeleton->getNumDofs()));
}

void Reference::place(const Motion& motion) {
  impl_->put(motion);
  for (dd::Joint* joint : impl_->joint) joint->setDampingCoefficient(0, 0);
}

void Reference::step(const std::vector<double>& torque) {
  Impl& me = *impl_;
  for (std::size_t j = 0; j < torque.size(); ++j) me.forces[Impl::at(me.joint[j])] = torque[j];
  me.skeleton->setForces(me.forces);
  me.world->step();
}

void Reference::read(std::vector<double>& angle, std::vector<double>& speed) const {
  for (std::size_t j = 0; j < impl_->joint.size(); ++j) {
    angle[j] = impl_->joint[j]->getPosition(0);
    speed[j] = impl_->joint[j]->getVelocity(0);
  }
}

int Reference::contacts() const {
  return static_cast<int>(impl_->world->getLastCollisionResult().getNumContacts());
}

double Reference::trunk_height_m() const { return impl_->trunk->getWorldTransform().translation().z(); }

}  // namespace pastern::multibody
