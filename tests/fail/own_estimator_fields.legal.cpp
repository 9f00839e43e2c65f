#include <steelyard/core.hpp>

#include <span>
#include <string>
#include <tuple>

struct largest {
  double most = 0.0;
  std::string name = "largest";
  auto readout() const { return [](double x) { return x; }; }
  largest fresh() const { return {}; }
  void add(std::span<double const> values, std::span<double const>) {
    for (double const x : values) most = x > most ? x : most;
  }
  void rescale(double) {}
  largest& operator+=(largest const& other) {
    most = other.most > most ? other.most : most;
    return *this;
  }
  double value() const { return most; }
  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.most);
  }
};

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const [most] = pipe.estimate({.size = 1000}, largest());
  return most.value > 2.0;
}
