// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/harder/normal_fit.hpp>
#include <steelyard/harder/rung.hpp>

namespace steelyard::inline v1::detail {

inline constexpr std::size_t most_mixed = 4;    // words that a mixture takes in
inline constexpr std::size_t most_modes = 8;    // normal laws in a mixture

/// A mixture of normal distributions fitted to weighted points in few dimensions, for laws with several modes.
class mixture_fit {
 public:
  [[nodiscard]] std::size_t size() const noexcept { return laws_.empty() ? 0 : laws_.front().size(); }
  [[nodiscard]] std::size_t modes() const noexcept { return laws_.size(); }

  /// A single law.
  static mixture_fit of(normal_fit const& whole) {
    mixture_fit one;
    one.log_shares_ = {0.0};
    one.laws_ = {whole};
    return one;
  }

  /// Logarithm of the density, less k/2 log(2 pi).
  [[nodiscard]] double log_density(std::span<double const> x) const noexcept {
    double each[most_modes], e[most_mixed], top = impossible, sum = 0.0;
    for (std::size_t m = 0; m < laws_.size(); ++m) {
      each[m] = log_shares_[m] - laws_[m].log_root() - 0.5 * laws_[m].standardise(x, std::span<double>(e, x.size()));
      top = std::max(top, each[m]);
    }
    for (std::size_t m = 0; m < laws_.size(); ++m) sum += portable_exp(each[m] - top);
    return top + portable_log(sum);
  }
  void draw(draws& source, std::span<double> x) const {
    double u = source.uniform(), e[most_mixed];
    std::size_t m = 0;
    for (; m + 1 < laws_.size() && u >= portable_exp(log_shares_[m]); ++m) u -= portable_exp(log_shares_[m]);
    for (std::size_t i = 0; i < x.size(); ++i) e[i] = source.normal();
    laws_[m].place(std::span<double const>(e, x.size()), x);
  }

  /// Fits 2, 4 or 8 laws to points in two parts that are independent of each other, as many as make the fits of the parts
  /// foretell each other best; none unless that gains on the single normal law `whole`.
  ///   start      all laws split in two, each along an axis of its own        [Linde, Buzo & Gray, IEEE Trans. Comm. 28, 1980]
  ///   then       a few rounds of k-means, and expectation-maximisation     [Dempster, Laird & Rubin, J. R. Stat. Soc. B 39, 1977]
  ///   how many   held-out likelihood                                       [Smyth, Stat. Comput. 10, 2000]
  /// Nothing is drawn, so the same points give the same fit.
  static mixture_fit of(normal_fit const& whole, weighted_points const (&points)[2]) {
    std::size_t const k = whole.size();
    mixture_fit none;
    if (k == 0 || k > most_mixed) return none;
    constexpr std::size_t enough = 400;                     // points of a part
    double const least = 4.0 * static_cast<double>(k + 2);  // points that a law is fitted to
    if (std::min(points[0].worth(), points[1].worth()) < 2.0 * least) return none;
    weighted_points parts[2], both;  // in units of `whole`
    for (std::size_t h = 0; h < 2; ++h) {
      std::size_t const n = points[h].weights.size(), stride = n / enough + 1;
      for (std::size_t p = 0; p < n; p += stride) {
        double e[most_mixed];
        whole.standardise(std::span<double const>(points[h].rows).subspan(p * k, k), std::span<double>(e, k));
        parts[h].rows.insert(parts[h].rows.end(), e, e + k);
        parts[h].weights.push_back(points[h].weights[p]);
      }
      both.rows.insert(both.rows.end(), parts[h].rows.begin(), parts[h].rows.end());
      both.weights.insert(both.weights.end(), parts[h].weights.begin(), parts[h].weights.end());
    }
    mixture const one = mixture::single(both, k);
    double const worth_it = one.score(both) + 0.05;
    if (hopeless(both, k, least)) return none;
    mixture from[2] = {mixture::single(parts[0], k), mixture::single(parts[1], k)};
    double best = worth_it;
    std::size_t times = 0;
    for (std::size_t t = 1; std::size_t{1} << t <= most_modes; ++t) {
      double score = 0.0;
      for (std::size_t h = 0; h < 2; ++h) {
        from[h] = mixture::grown(from[h], parts[h], least, 30);
        score += 0.5 * from[h].score(parts[1 - h]);
      }
      if (score >= best) {
        best = score + 0.02;
        times = t;
      } else if (t > 1) {  // four clusters may look like none to two laws
        break;
      }
    }
    if (times == 0) return none;
    mixture fit = one;
    for (std::size_t t = 0; t < times; ++t) fit = mixture::grown(fit, both, least, 30);
    mixture_fit made;
    for (law const& each : fit.laws) {
      made.log_shares_.push_back(portable_log(each.share));
      made.laws_.push_back(whole.around(each.mean, each.factor));
    }
    return made;
  }

 private:
  /// Whether two and four laws gain nothing even on the points that they are fitted to; a few hundred say so.
  static bool hopeless(weighted_points const& points, std::size_t k, double least) {
    weighted_points some;
    std::size_t const n = points.weights.size(), stride = n / 250 + 1;
    for (std::size_t p = 0; p < n; p += stride) {
      some.rows.insert(some.rows.end(), points.rows.data() + p * k, points.rows.data() + (p + 1) * k);
      some.weights.push_back(points.weights[p]);
    }
    mixture from = mixture::single(some, k);
    double const wanted = from.score(some) + 0.05;
    for (int doubled = 0; doubled < 2; ++doubled) {
      from = mixture::grown(from, some, least, 6);
      if (from.score(some) >= wanted) return false;
    }
    return true;
  }

  struct law {
    double share = 1.0;
    std::vector<double> mean;
    lower_triangle factor;
    double log_top = 0.0;  // logarithm of the share over the root of the determinant
  };
  /// Laws while they are being fitted.
  struct mixture {
    std::size_t k = 0;
    std::vector<law> laws;

    /// Moments of points in proportion to their parts in each law; a law with too few points is left out.
    static mixture of(weighted_points const& points, std::size_t k, std::vector<double> const& parts, std::size_t n, double least) {
      mixture made{k, {}};
      double const total = points.total();
      double all = 0.0;
      for (std::size_t m = 0; m < n; ++m) {
        double sum = 0.0, squares = 0.0;
        law each{0.0, std::vector<double>(k, 0.0), lower_triangle(k)};
        for (std::size_t p = 0; p < points.weights.size(); ++p) {
          double const w = points.weights[p] * parts[p * n + m];
          sum += w;
          squares += w * w;
          for (std::size_t i = 0; i < k; ++i) each.mean[i] += w * points.rows[p * k + i];
        }
        double const worth = squares > 0.0 ? sum * (sum / squares) : 0.0;
        if (worth < least) continue;
        for (double& x : each.mean) x /= sum;
        for (std::size_t p = 0; p < points.weights.size(); ++p) {
          double const w = points.weights[p] * parts[p * n + m] / sum;
          for (std::size_t i = 0; i < k; ++i)
            for (std::size_t j = 0; j <= i; ++j)
              each.factor.row(i)[j] += w * (points.rows[p * k + i] - each.mean[i]) * (points.rows[p * k + j] - each.mean[j]);
        }
        each.factor.add(each.factor, static_cast<double>(k + 2) / (worth - static_cast<double>(k + 1)));
        each.factor.factorise(1e-14);
        each.share = sum / total;
        each.log_top = portable_log(each.share);
        for (std::size_t i = 0; i < k; ++i) each.log_top -= portable_log(each.factor.row(i)[i]);
        all += each.share;
        made.laws.push_back(std::move(each));
      }
      for (law& each : made.laws) {
        each.share /= all;
        each.log_top -= portable_log(all);
      }
      return made;
    }
    static mixture single(weighted_points const& points, std::size_t k) {
      return of(points, k, std::vector<double>(points.weights.size(), 1.0), 1, 0.0);
    }

    /// Logarithms of the laws' parts in the density at x.
    void look(double const* x, double* each) const noexcept {
      for (std::size_t m = 0; m < laws.size(); ++m) {
        law const& at = laws[m];
        double const *row = at.factor.row(0), *mean = at.mean.data();
        double e[most_mixed], squares = 0.0;
        for (std::size_t i = 0; i < k; row += ++i) {
          double rest = x[i] - mean[i];
          for (std::size_t j = 0; j < i; ++j) rest -= row[j] * e[j];
          e[i] = rest / row[i];
          squares += e[i] * e[i];
        }
        each[m] = at.log_top - 0.5 * squares;
      }
    }
    /// Mean log-density of points; fills the parts of the laws in each point where asked to.
    double score(weighted_points const& points, std::vector<double>* parts = nullptr) const {
      std::size_t const n = laws.size();
      double total = 0.0, all = 0.0, each[most_modes];
      for (std::size_t p = 0; p < points.weights.size(); ++p) {
        look(points.rows.data() + p * k, each);
        double const top = *std::max_element(each, each + n);
        double sum = 0.0;
        for (std::size_t m = 0; m < n; ++m) sum += each[m] = portable_exp(each[m] - top);
        for (std::size_t m = 0; m < n && parts != nullptr; ++m) (*parts)[p * n + m] = each[m] / sum;
        total += points.weights[p];
        all += points.weights[p] * (top + portable_log(sum));
      }
      return all / total;
    }

    /// All laws split in two and fitted anew.
    static mixture grown(mixture const& from, weighted_points const& points, double least, int rounds) {
      std::size_t const k = from.k, n = 2 * from.laws.size();
      std::vector<double> centres;
      std::vector<double> const axes = from.split_axes(points);
      for (std::size_t m = 0; m < from.laws.size(); ++m)
        for (double const side : {-1.0, 1.0})
          for (std::size_t i = 0; i < k; ++i) centres.push_back(from.laws[m].mean[i] + side * axes[m * k + i]);
      std::vector<double> parts(points.weights.size() * n);
      for (int round = 0; round < 5; ++round) {
        std::vector<double> sums(n * k, 0.0), weight(n, 0.0);
        std::fill(parts.begin(), parts.end(), 0.0);
        for (std::size_t p = 0; p < points.weights.size(); ++p) {
          std::size_t nearest = 0;
          double least_way = -1.0;
          for (std::size_t m = 0; m < n; ++m) {
            double way = 0.0;
            for (std::size_t i = 0; i < k; ++i) way += (points.rows[p * k + i] - centres[m * k + i]) * (points.rows[p * k + i] - centres[m * k + i]);
            if (least_way < 0.0 || way < least_way) {
              nearest = m;
              least_way = way;
            }
          }
          parts[p * n + nearest] = 1.0;
          weight[nearest] += points.weights[p];
          for (std::size_t i = 0; i < k; ++i) sums[nearest * k + i] += points.weights[p] * points.rows[p * k + i];
        }
        for (std::size_t m = 0; m < n; ++m)
          for (std::size_t i = 0; i < k && weight[m] > 0.0; ++i) centres[m * k + i] = sums[m * k + i] / weight[m];
      }
      mixture fit = of(points, k, parts, n, least);
      if (fit.laws.empty()) return from;
      double before = impossible;
      for (int round = 0; round < rounds; ++round) {
        parts.resize(points.weights.size() * fit.laws.size());
        double const now = fit.score(points, &parts);
        if (now < before + 2e-3) break;
        before = now;
        mixture next = of(points, k, parts, fit.laws.size(), least);
        if (next.laws.empty()) break;
        fit = std::move(next);
      }
      return fit;
    }
    /// Half-axes along which each law is to be split: where the points that are most likely its own, standardised, have
    /// the smallest fourth moment, as two clusters do: fixed points v = E (v'e)^3 e - 3 v, from each axis.
    ///     [Pena & Prieto, J. Am. Stat. Assoc. 96, 2001; the iteration: Hyvarinen & Oja, Neural Comput. 9, 1997]
    std::vector<double> split_axes(weighted_points const& points) const {
      std::vector<double> own(points.weights.size() * laws.size()), axes;
      score(points, &own);
      for (std::size_t m = 0; m < laws.size(); ++m) {
        weighted_points here;
        for (std::size_t p = 0; p < points.weights.size(); ++p) {
          double const* const each = own.data() + p * laws.size();
          if (std::max_element(each, each + laws.size()) != each + m) continue;
          for (std::size_t i = 0; i < k; ++i) {
            double rest = points.rows[p * k + i] - laws[m].mean[i];
            for (std::size_t j = 0; j < i; ++j) rest -= laws[m].factor.row(i)[j] * here.rows[here.rows.size() - i + j];
            here.rows.push_back(rest / laws[m].factor.row(i)[i]);
          }
          here.weights.push_back(points.weights[p]);
        }
        double best[most_mixed] = {1.0}, least = 1e300;
        for (std::size_t start = 0; start < k; ++start) {
          double v[most_mixed] = {};
          v[start] = 1.0;
          for (int round = 0; round < (k > 1 ? 6 : 1); ++round) {
            double next[most_mixed] = {}, total = 0.0, fourth = 0.0, norm = 0.0;
            for (std::size_t p = 0; p < here.weights.size(); ++p) {
              double const* const e = here.rows.data() + p * k;
              double along = 0.0;
              for (std::size_t i = 0; i < k; ++i) along += v[i] * e[i];
              double const cube = here.weights[p] * along * along * along;
              total += here.weights[p];
              fourth += cube * along;
              for (std::size_t i = 0; i < k; ++i) next[i] += cube * e[i];
            }
            if (!(total > 0.0)) break;
            if (fourth / total < least) {
              least = fourth / total;
              std::copy(v, v + k, best);
            }
            for (std::size_t i = 0; i < k; ++i) {
              next[i] = next[i] / total - 3.0 * v[i];
              norm += next[i] * next[i];
            }
            if (!(norm > 0.0)) break;
            for (std::size_t i = 0; i < k; ++i) v[i] = next[i] / portable_sqrt(norm);
          }
        }
        for (std::size_t i = 0; i < k; ++i) {
          double along = 0.0;
          for (std::size_t j = 0; j <= i; ++j) along += laws[m].factor.row(i)[j] * best[j];
          axes.push_back(along);
        }
      }
      return axes;
    }
  };

  std::vector<double> log_shares_;
  std::vector<normal_fit> laws_;
};

}  // namespace steelyard::inline v1::detail
