// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <concepts>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>
#include <tuple>
#include <utility>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/answers.hpp>
#include <steelyard/harder/run_tempered.hpp>
#include <steelyard/run/pipeline.hpp>

namespace steelyard::inline v1 {

/// Answers of `run_until_sound`, in the order asked, with the sample they came from and what each part cost.
template <class X, class... As>
class sound_answers : public answers<As...> {
 public:
  sound_answers(answers<As...> all, weighted_sample<X> sample, std::uint64_t plain, std::uint64_t tempered)
      : answers<As...>(std::move(all)), sample_(std::move(sample)), plain_(plain), tempered_(tempered) {}

  [[nodiscard]] weighted_sample<X> const& sample() const noexcept { return sample_; }
  /// Calls of the sampler by plain weighting, and by the tempered run; 0 where there was none.
  [[nodiscard]] std::uint64_t plain_calls() const noexcept { return plain_; }
  [[nodiscard]] std::uint64_t tempered_calls() const noexcept { return tempered_; }

 private:
  weighted_sample<X> sample_;
  std::uint64_t plain_, tempered_;
};

namespace detail {

/// The verdict of an answer: its own, or the worse of its two ends; sound where it has none.
template <class Answer>
verdict verdict_on(Answer const& answer) {
  if constexpr (requires { { answer.verdict() } -> std::convertible_to<verdict>; })
    return answer.verdict();
  else if constexpr (requires { { answer.lower.verdict() } -> std::convertible_to<verdict>; answer.upper.verdict(); })
    return std::max(answer.lower.verdict(), answer.upper.verdict());
  else if constexpr (requires { { answer[0].verdict() } -> std::convertible_to<verdict>; answer.size(); }) {
    verdict worst = verdict::sound;
    for (std::size_t i = 0; i < answer.size(); ++i) worst = std::max(worst, answer[i].verdict());
    return worst;
  } else {
    return verdict::sound;
  }
}
template <class... As>
verdict worst_of(answers<As...> const& all) {
  return [&]<std::size_t... I>(std::index_sequence<I...>) {
    verdict worst = all.diagnosis().verdict();
    ((worst = std::max(worst, verdict_on(all.template get<I>()))), ...);
    return worst;
  }(std::index_sequence_for<As...>{});
}

/// The sample with a finding more, and other calls to its account.
template <class X>
weighted_sample<X> with_cost(weighted_sample<X> const& sample, std::string text, std::uint64_t more_calls) {
  auto origin = std::make_shared<sample_origin>(*sample.origin());
  origin->findings.insert(origin->findings.begin(), {finding_kind::cost, std::move(text)});
  origin->calls += more_calls;
  return weighted_sample<X>(sample.store(), sample.columns(), std::move(origin), "run_until_sound");
}

/// How many plain draws it takes for answers to settle at all, e^KL with KL = E ll - log Z over the posterior.
///                                             [Chatterjee & Diaconis, Ann. Appl. Probab. 28, 2018, 1099]
/// @param sample  from a tempered run that reached the reading: its base log-weights are minus the log-likelihoods
template <class X>
double plain_draws_asked_for(weighted_sample<X> const& sample) {
  double sum = 0.0, whole = 0.0;
  for (std::size_t i = 0; i < sample.size(); ++i) {
    double const m = static_cast<double>(sample.origin()->counts[i]);
    sum -= m * sample.columns().base[i];
    whole += m;
  }
  return portable_exp(std::min(690.0, sum / whole - sample.log_evidence().value));
}

inline std::string plain_text(diagnosis const& health, std::uint64_t calls) {
  return "Plain weighting took " + std::to_string(calls) + " calls of the sampler, worth " +
         (health.effective_size() < 1.5 ? "no more than one draw" : short_number(health.effective_size()) + " equal draws") + " (" +
         std::string(to_string(health.verdict())) + ").";
}

/// A tempered run in the spirit of a plain plan.
inline tempered_plan tempered_like(plan const& how) {
  tempered_plan t;
  t.seed = how.seed;
  t.threads = how.threads;
  t.keep = how.keep;
  t.on_failure = how.on_failure;
  t.time_limit = how.time_limit;
  t.progress = how.progress;
  t.token = how.token;
  t.executor = how.executor;
  return t;
}

inline constexpr double worth_extending = 20'000.0;  // calls: a tempered run rarely costs less

}  // namespace detail

/// Weighs plainly, and where the weights cannot carry the questions, goes on: with more plain draws where a few are
/// enough, else by a tempered run. What was done, and what each part cost, is the first of the findings.
/// An event that is rare under sound weights is no matter for tempering: that is said, and left as it is.
/// @param sharp  how to temper, where it comes to that
/// @throws as pipeline::run and run_tempered do
template <class Sampler, class Weighter, class... Es>
auto run_until_sound(pipeline<Sampler, Weighter> const& pipe, plan const& how, tempered_plan const& sharp, Es const&... questions) {
  using X = typename pipeline<Sampler, Weighter>::state_type;
  detail::refuse_plan("run_until_sound", sharp);
  auto const ask = [&]<class... As>(answers<As...> all, weighted_sample<X> sample, std::uint64_t plain, std::uint64_t tempered) {
    return sound_answers<X, As...>(std::move(all), std::move(sample), plain, tempered);
  };
  weighted_sample<X> sample = pipe.run(how);
  auto const outcome = [&](weighted_sample<X> const& of, std::string text, std::uint64_t plain, std::uint64_t tempered) {
    weighted_sample<X> told = detail::with_cost(of, std::move(text), tempered > 0 ? plain : 0);
    return ask(told.estimate(questions...), told, plain, tempered);
  };
  std::string done = detail::plain_text(sample.diagnosis(), sample.sampler_calls());
  steelyard::diagnosis const first = sample.diagnosis();
  bool const weak = first.verdict() != verdict::sound;
  double const wanted = 1.5 * static_cast<double>(first.drawn()) * (50.0 / std::max(1.0, first.effective_size()));
  if (weak && how.source.independent() && first.effective_size() >= 5.0 && first.settles() && wanted < detail::worth_extending &&
      wanted > static_cast<double>(first.drawn())) {
    std::uint64_t const before = sample.sampler_calls();
    sample = pipe.extend(std::move(sample), count(static_cast<std::uint64_t>(wanted) - first.drawn()));
    done += " More draws took another " + std::to_string(sample.sampler_calls() - before) + ", worth " +
            detail::short_number(sample.diagnosis().effective_size()) + " in all.";
  }
  std::uint64_t const plain = sample.sampler_calls();
  if (sample.diagnosis().verdict() == verdict::sound) {
    bool const fine = detail::worst_of(sample.estimate(questions...)) == verdict::sound;
    done += fine ? " That carries the questions."
                 : " The weights can carry questions, but not all of these: what is rare among likely states is no matter for a "
                   "tempered run. Draw more, or ask low_probability() for the chance of a rare event.";
    return outcome(sample, std::move(done), plain, 0);
  }
  weighted_sample<X> const tempered = run_tempered(pipe, sharp);
  std::uint64_t const calls = tempered.sampler_calls();
  done += " A tempered run took " + std::to_string(calls) + ", with " + detail::short_number(tempered.diagnosis().lineages()) +
          " effective lineages (" + std::string(to_string(tempered.diagnosis().verdict())) + ").";
  if (tempered.diagnosis().verdict() == verdict::sound)
    done += " Plain weighting would ask for at least about " + detail::short_number(detail::plain_draws_asked_for(tempered)) +
            " draws before answers settle at all.";
  bool const better = tempered.diagnosis().verdict() <= sample.diagnosis().verdict();
  if (!better) {
    done += " It fell short of plain weighting, whose answers these are.";
    weighted_sample<X> told = detail::with_cost(sample, std::move(done), calls);
    return ask(told.estimate(questions...), told, plain, calls);
  }
  return outcome(tempered, std::move(done), plain, calls);
}
template <class Sampler, class Weighter, class... Es>
auto run_until_sound(pipeline<Sampler, Weighter> const& pipe, plan const& how, Es const&... questions) {
  return run_until_sound(pipe, how, detail::tempered_like(how), questions...);
}

}  // namespace steelyard::inline v1

template <class X, class... As>
struct std::tuple_size<steelyard::sound_answers<X, As...>> : std::integral_constant<std::size_t, sizeof...(As)> {};
template <std::size_t I, class X, class... As>
struct std::tuple_element<I, steelyard::sound_answers<X, As...>> {
  using type = std::tuple_element_t<I, std::tuple<As...>>;
};
