#include "analysis/compare/exposure_set.h"

#include <Eigen/Dense>
#include <algorithm>
#include <boost/math/distributions/fisher_f.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>
#include <map>

#include "analysis/compare/exposure_light.h"

namespace focusfall {
namespace {

using Eigen::Index;

constexpr double kFamilyError = 0.05;        // of each family of candidates
constexpr double kSingleFamilyError = 0.01;  // single frames are many, and are blamed one by one
constexpr double kSlopeTolerance = 0.02;     // a slope within this of 1 is 1
constexpr double kNormal95 = 1.959964;

// White noise of a level from which its own uncertainty is told apart: what shutters and diaphragms repeat to
// (judgement; only the ratio between frames matters).
constexpr double kRepeatabilityEv = 0.01;

// Flicker: the scatter below a hundredth of a second must be this many times that of the longer exposures, and
// significantly so, with this many frames on either side. Judgement.
constexpr double kFlickerSpread = 3;
constexpr double kFlickerSignificance = 0.01;
constexpr int kFlickerFrames = 5;

// Gaps between frames are counted in the usual gap, within these bounds: a pause is not an endless wander.
constexpr double kShortestGap = 0.2, kLongestGap = 10;

enum class Kind { f_number, time, iso, step, single };

struct Candidate {
  Kind kind = Kind::single;
  double mark = 0;          // of a control
  std::size_t frame = 0;    // the single one, or the first after the step
};

double t_quantile(double two_sided, int degrees_of_freedom) {
  const boost::math::students_t distribution(std::max(1, degrees_of_freedom));
  return boost::math::quantile(boost::math::complement(distribution, two_sided / 2));
}

double control(const SetFrame& frame, Kind kind) {
  return kind == Kind::f_number ? frame.f_number : kind == Kind::time ? frame.exposure_time_s : frame.iso_speed;
}

// Marks of a control with the frames that used them.
std::map<double, std::vector<std::size_t>> marks_of(const std::vector<SetFrame>& frames, Kind kind) {
  std::map<double, std::vector<std::size_t>> marks;
  for (std::size_t i = 0; i < frames.size(); ++i) marks[control(frames[i], kind)].push_back(i);
  return marks;
}

// Whether the frames of a mark come in at least two runs with others between them.
bool interleaved(const std::vector<std::size_t>& users) {
  for (std::size_t k = 1; k < users.size(); ++k) {
    if (users[k] != users[k - 1] + 1) return true;
  }
  return false;
}

class Audit {
 public:
  Audit(const std::vector<SetFrame>& frames, const SetOptions& options)
      : frames_(frames), options_(options), n_(static_cast<Index>(frames.size())) {
    levels_ = Eigen::VectorXd(n_);
    exposures_ = Eigen::VectorXd(n_);
    for (Index i = 0; i < n_; ++i) {
      levels_[i] = frame(i).level_ev;
      exposures_[i] = frame(i).exposure_ev;
    }
    set_steps();
    base_ = Eigen::MatrixXd::Ones(n_, 1);
    add_trend();
    span_ev_ = exposures_.maxCoeff() - exposures_.minCoeff();
  }

  SetAudit run() {
    find_slope_column();
    audit_.light_flickers = find_flicker();
    select();
    const LightFit fit = fit_light(design_, target_, steps_);
    set_slope(fit);
    weigh_frames();
    audit_.diaphragm = mark_errors(Kind::f_number);
    audit_.shutter = mark_errors(Kind::time);
    audit_.iso = mark_errors(Kind::iso);
    judge_frames();
    return std::move(audit_);
  }

 private:
  const SetFrame& frame(Index i) const { return frames_[static_cast<std::size_t>(i)]; }

  void set_steps() {
    std::vector<double> gaps;
    for (std::size_t i = 1; i < frames_.size(); ++i) {
      if (frames_[i].taken_at_s && frames_[i - 1].taken_at_s) {
        gaps.push_back(*frames_[i].taken_at_s - *frames_[i - 1].taken_at_s);
      }
    }
    double usual = 0;
    if (gaps.size() + 1 == frames_.size()) {
      std::vector<double> sorted = gaps;
      std::ranges::sort(sorted);
      usual = sorted[sorted.size() / 2];
    }
    for (std::size_t i = 0; i < frames_.size(); ++i) {
      const double relative = frames_[i].sigma_ev / kRepeatabilityEv;
      steps_.variance.push_back(1 + relative * relative);
      steps_.gap.push_back(i > 0 && usual > 0 ? std::clamp(gaps[i - 1] / usual, kShortestGap, kLongestGap) : 1);
    }
  }

  void append(Eigen::MatrixXd& design, const Eigen::VectorXd& column) const {
    design.conservativeResize(Eigen::NoChange, design.cols() + 1);
    design.col(design.cols() - 1) = column;
  }

  // A straight trend of the light, where there are frames enough to tell it.
  void add_trend() {
    constexpr Index kLeast = 8;
    if (n_ < kLeast) return;
    Eigen::VectorXd trend(n_);
    double time = 0;
    for (Index i = 0; i < n_; ++i) {
      if (i > 0) time += steps_.gap[static_cast<std::size_t>(i)];
      trend[i] = time;
    }
    append(base_, (trend.array() - trend.mean()).matrix() / std::max(1.0, time));
  }

  // The exposure is a column of its own where its slope can be told; else it is taken off with slope 1.
  void find_slope_column() {
    slope_column_ = span_ev_ >= kLeastSpanEv && n_ >= base_.cols() + 3 && !is_spanned(base_, exposures_)
                        ? std::optional<Index>(base_.cols()) : std::nullopt;
    design_ = base_;
    target_ = levels_;
    if (slope_column_) {
      append(design_, (exposures_.array() - exposures_.mean()).matrix());
    } else {
      target_ -= exposures_;
    }
  }

  // Scatter of the short exposures against that of the longer ones.
  bool find_flicker() {
    const LightFit fit = fit_light(design_, target_, steps_);
    const Eigen::VectorXd left = target_ - design_ * fit.coefficients;
    const SmoothedLight light = smoothed_light(left, fit, steps_);
    std::vector<double> squares[2];
    for (Index i = 0; i < n_; ++i) {
      const double residual = left[i] - light.level_ev[static_cast<std::size_t>(i)];
      squares[is_short(i) ? 1 : 0].push_back(residual * residual);
    }
    if (std::min(squares[0].size(), squares[1].size()) < static_cast<std::size_t>(kFlickerFrames)) return false;
    double middle[2];
    for (int g = 0; g < 2; ++g) {
      auto sorted = squares[g];
      std::ranges::sort(sorted);
      middle[g] = sorted[sorted.size() / 2];   // robust against a fault of one mark or frame
    }
    const double ratio = middle[1] / std::max(middle[0], 1e-8);
    const boost::math::fisher_f distribution(static_cast<double>(squares[1].size()) / 2,
                                             static_cast<double>(squares[0].size()) / 2);
    const bool significant = boost::math::cdf(boost::math::complement(distribution, ratio)) < kFlickerSignificance;
    if (ratio < kFlickerSpread * kFlickerSpread || !significant) return false;
    for (Index i = 0; i < n_; ++i) {
      if (is_short(i)) steps_.variance[static_cast<std::size_t>(i)] *= ratio;
    }
    return true;
  }
  bool is_short(Index i) const { return frame(i).exposure_time_s < 0.98 * kFlickerPeriodS; }

  Eigen::VectorXd column_of(const Candidate& candidate) const {
    Eigen::VectorXd column = Eigen::VectorXd::Zero(n_);
    for (Index i = 0; i < n_; ++i) {
      const auto k = static_cast<std::size_t>(i);
      switch (candidate.kind) {
        case Kind::single: column[i] = k == candidate.frame; break;
        case Kind::step: column[i] = k >= candidate.frame; break;
        default: column[i] = control(frame(i), candidate.kind) == candidate.mark; break;
      }
    }
    return column;
  }

  std::vector<Candidate> candidates() const {
    std::vector<Candidate> all;
    for (const Kind kind : {Kind::f_number, Kind::time, Kind::iso}) {
      const auto marks = marks_of(frames_, kind);
      if (marks.size() < 2) continue;
      for (const auto& [mark, users] : marks) {
        if (interleaved(users)) all.push_back({kind, mark, 0});
      }
    }
    for (std::size_t i = 0; i < frames_.size(); ++i) {
      // The first and the last frame alone cannot be told from a change of the light.
      if (i >= 2 && i + 2 <= frames_.size()) all.push_back({Kind::step, 0, i});
      const bool wanders = audit_.light_flickers && is_short(static_cast<Index>(i));
      if (!wanders) all.push_back({Kind::single, 0, i});
    }
    return all;
  }

  // Takes in what explains most, until nothing is significant.
  void select() {
    const std::vector<Candidate> all = candidates();
    std::map<Kind, int> family;
    for (const Candidate& c : all) ++family[c.kind];
    std::vector<bool> taken(all.size(), false);
    const Index most = std::max<Index>(0, n_ / 3);
    for (Index count = 0; count < most; ++count) {
      const LightFit now = fit_light(design_, target_, steps_);
      const int left = now.degrees_of_freedom - 1;
      if (left < 2) return;
      double best_gain = 0;
      std::size_t best = all.size();
      for (std::size_t c = 0; c < all.size(); ++c) {
        if (taken[c]) continue;
        const Eigen::VectorXd column = column_of(all[c]);
        if (is_spanned(design_, column)) continue;
        Eigen::MatrixXd wider = design_;
        append(wider, column);
        const LightFit fit = fit_light(wider, target_, steps_);
        const double effect = std::abs(fit.coefficients[fit.coefficients.size() - 1]);
        const bool is_mark = all[c].kind != Kind::step && all[c].kind != Kind::single;
        if (effect < (is_mark ? kLeastMarkErrorEv : kLeastFrameErrorEv)) continue;
        const double level = all[c].kind == Kind::single ? kSingleFamilyError : kFamilyError;
        const double t = t_quantile(level / family[all[c].kind], left);
        const double needed = static_cast<double>(n_) * std::log1p(t * t / left);
        const double gain = now.minus_two_log_likelihood - fit.minus_two_log_likelihood - needed;
        if (gain > best_gain) best_gain = gain, best = c;
      }
      if (best == all.size()) return;
      taken[best] = true;
      append(design_, column_of(all[best]));
      selected_.push_back(all[best]);
    }
  }

  void set_slope(const LightFit& fit) {
    if (!slope_column_) return;
    const double slope = fit.coefficients[*slope_column_];
    const double half = t_quantile(kFamilyError, fit.degrees_of_freedom) *
                        std::sqrt(fit.covariance(*slope_column_, *slope_column_));
    audit_.slope = options_.contrast_unknown ? slope_by_halves() : Interval{slope, slope - half, slope + half};
    const bool is_one = slope - half <= 1 + kSlopeTolerance && slope + half >= 1 - kSlopeTolerance;
    if (options_.contrast_unknown || !is_one) slope_ = slope;
    audit_.contrast = slope_;
    audit_.scatter_ev = fit.sigma_ev;
  }

  // A contrast that is fitted makes the slope 1 by definition. What can still be tested is whether every second frame
  // follows the contrast of the others: two slopes in one fit, under one light, and their ratio.
  std::optional<Interval> slope_by_halves() const {
    Eigen::MatrixXd design = design_;
    Eigen::VectorXd others = design.col(*slope_column_);
    for (Index i = 0; i < n_; ++i) (i % 2 == 0 ? others[i] : design(i, *slope_column_)) = 0;
    if (is_spanned(design, others) || design.cols() + 2 >= n_) return std::nullopt;
    append(design, others);
    const LightFit fit = fit_light(design, target_, steps_);
    const Index a = *slope_column_, b = design.cols() - 1;
    const double first = fit.coefficients[a], second = fit.coefficients[b], ratio = second / first;
    if (!(first > 0)) return std::nullopt;
    // Variance of a ratio, to first order.
    const double variance = ratio * ratio * (fit.covariance(a, a) / (first * first) + fit.covariance(b, b) / (second * second) -
                                             2 * fit.covariance(a, b) / (first * second));
    const double half = t_quantile(kFamilyError, fit.degrees_of_freedom) * std::sqrt(std::max(0.0, variance));
    return Interval{ratio, ratio - half, ratio + half};
  }

  // From here on the slope is settled: marks and frames are judged against that line.
  void weigh_frames() {
    target_ = levels_ / slope_ - exposures_;
    design_ = base_;
    for (const Candidate& c : selected_) append(design_, column_of(c));
    audit_.scatter_ev = fit_light(design_, target_, steps_).sigma_ev;
  }

  // All marks of a control together against the reference: wide open, the longest time, the lowest ISO.
  std::vector<MarkError> mark_errors(Kind kind) const {
    const auto marks = marks_of(frames_, kind);
    std::vector<MarkError> errors;
    const double reference = kind == Kind::time ? marks.rbegin()->first : marks.begin()->first;
    Eigen::MatrixXd design = base_;
    for (const Candidate& c : selected_) {
      if (c.kind == kind) continue;
      const Eigen::VectorXd column = column_of(c);
      if (!is_spanned(design, column)) append(design, column);
    }
    std::vector<std::optional<Index>> columns;
    for (const auto& [mark, users] : marks) {
      const Eigen::VectorXd column = column_of({kind, mark, 0});
      const bool possible = mark != reference && !is_spanned(design, column) && design.cols() + 2 < n_;
      columns.push_back(possible ? std::optional<Index>(design.cols()) : std::nullopt);
      if (possible) append(design, column);
      errors.push_back({.mark = mark, .frames = static_cast<int>(users.size()), .reference = mark == reference});
    }
    const LightFit fit = fit_light(design, target_, steps_);
    const int compared = static_cast<int>(std::ranges::count_if(columns, [](const auto& c) { return c.has_value(); }));
    std::vector<MarkError> told;
    auto users = marks.begin();
    for (std::size_t m = 0; m < errors.size(); ++m, ++users) {
      MarkError& error = errors[m];
      if (columns[m]) {
        // Bonferroni: m intervals at 1 - .05 / m hold together at 95 % at least.
        const double half = t_quantile(kFamilyError / compared, fit.degrees_of_freedom) *
                            std::sqrt(fit.covariance(*columns[m], *columns[m]));
        error.error_ev = fit.coefficients[*columns[m]];
        error.low_ev = error.error_ev - half, error.high_ev = error.error_ev + half;
        const bool outside = error.low_ev > 0 || error.high_ev < 0;
        error.blamed = outside && std::abs(error.error_ev) >= kLeastMarkErrorEv && interleaved(users->second) &&
                       !(kind == Kind::time && audit_.light_flickers);
      } else if (!error.reference) {
        continue;   // not told apart from something else in this set
      }
      told.push_back(error);
    }
    return told;
  }

  // Two controls that moved together: the same frames used both marks.
  bool shared_with_other_control(const Candidate& c) const {
    const Eigen::VectorXd column = column_of(c);
    const Kind other = c.kind == Kind::f_number ? Kind::time : Kind::f_number;
    if (c.kind == Kind::iso) return false;
    for (const auto& [mark, users] : marks_of(frames_, other)) {
      if ((column_of({other, mark, 0}) - column).norm() == 0) return true;
    }
    return false;
  }

  ExposureCause cause_of(Index i) const {
    for (const Candidate& c : selected_) {
      if (c.kind == Kind::single && c.frame == static_cast<std::size_t>(i)) return ExposureCause::single;
    }
    for (const Candidate& c : selected_) {
      if (c.kind == Kind::step || c.kind == Kind::single || control(frame(i), c.kind) != c.mark) continue;
      if (shared_with_other_control(c)) return ExposureCause::diaphragm_or_shutter;
      return c.kind == Kind::f_number ? ExposureCause::diaphragm : c.kind == Kind::time ? ExposureCause::shutter
                                                                                         : ExposureCause::iso;
    }
    return audit_.light_flickers && is_short(i) ? ExposureCause::light_flickers : ExposureCause::none;
  }

  void judge_frames() {
    const LightFit fit = fit_light(design_, target_, steps_);
    // The light is the base, the steps and the walk; what else was taken in is error.
    Eigen::VectorXd light = base_ * fit.coefficients.head(base_.cols());
    Eigen::VectorXd errors = Eigen::VectorXd::Zero(n_);
    for (std::size_t s = 0; s < selected_.size(); ++s) {
      const Eigen::VectorXd part = column_of(selected_[s]) * fit.coefficients[base_.cols() + static_cast<Index>(s)];
      (selected_[s].kind == Kind::step ? light : errors) += part;
    }
    const SmoothedLight walk = smoothed_light(target_ - light - errors, fit, steps_);
    Eigen::VectorXd whole_light(n_);
    for (Index i = 0; i < n_; ++i) {
      const auto k = static_cast<std::size_t>(i);
      whole_light[i] = light[i] + walk.level_ev[k];
      SetFrameError judged;
      const double error = target_[i] - whole_light[i];
      const double half = kNormal95 * std::sqrt(fit.sigma_ev * fit.sigma_ev * steps_.variance[k] +
                                                walk.sigma_ev[k] * walk.sigma_ev[k]);
      judged.error_ev = {error, error - half, error + half};
      const bool outside = judged.error_ev.low > 0 || judged.error_ev.high < 0;
      const bool odd = std::abs(error) >= kLeastFrameErrorEv;
      const ExposureCause cause = cause_of(i);
      const bool flickers = cause == ExposureCause::light_flickers;
      judged.verdict = ExposureVerdict::as_predicted;
      if (odd && (outside || flickers)) {
        judged.verdict = error > 0 ? ExposureVerdict::over : ExposureVerdict::under;
        judged.cause = cause;
      } else if (!flickers) {
        judged.cause = cause;
      }
      audit_.frames.push_back(judged);
    }
    set_light_changes(fit, whole_light, walk);
  }

  void set_light_changes(const LightFit& fit, const Eigen::VectorXd& whole_light, const SmoothedLight& walk) {
    for (std::size_t s = 0; s < selected_.size(); ++s) {
      if (selected_[s].kind != Kind::step) continue;
      const Index at = base_.cols() + static_cast<Index>(s);
      const double half = t_quantile(kFamilyError, fit.degrees_of_freedom) * std::sqrt(fit.covariance(at, at));
      const double change = fit.coefficients[at];
      audit_.light_changes.push_back({selected_[s].frame - 1, selected_[s].frame, {change, change - half, change + half}, true});
    }
    // A drift: from the darkest to the brightest light between, steps taken out.
    Eigen::VectorXd drift = whole_light;
    for (std::size_t s = 0; s < selected_.size(); ++s) {
      if (selected_[s].kind == Kind::step) {
        drift -= column_of(selected_[s]) * fit.coefficients[base_.cols() + static_cast<Index>(s)];
      }
    }
    Index low = 0, high = 0;
    drift.minCoeff(&low);
    drift.maxCoeff(&high);
    const auto from = static_cast<std::size_t>(std::min(low, high)), to = static_cast<std::size_t>(std::max(low, high));
    const double change = drift[static_cast<Index>(to)] - drift[static_cast<Index>(from)];
    const double slope_sigma = base_.cols() > 1 ? std::sqrt(fit.covariance(1, 1)) : 0;
    const double half = kNormal95 * std::hypot(walk.sigma_ev[from], walk.sigma_ev[to], slope_sigma);
    if (std::abs(change) < kLeastFrameErrorEv || std::abs(change) < half) return;
    audit_.light_changes.push_back({from, to, {change, change - half, change + half}, false});
  }

  const std::vector<SetFrame>& frames_;
  SetOptions options_;
  Index n_;
  Eigen::VectorXd levels_, exposures_, target_;
  Eigen::MatrixXd base_, design_;
  LightSteps steps_;
  std::optional<Index> slope_column_;
  double span_ev_ = 0;
  double slope_ = 1;
  std::vector<Candidate> selected_;
  SetAudit audit_;
};

}  // namespace

SetAudit audit_set(const std::vector<SetFrame>& frames, const SetOptions& options) {
  return Audit(frames, options).run();
}

}  // namespace focusfall
