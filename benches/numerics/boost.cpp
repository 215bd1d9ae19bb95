// Times Boost.Math on a table of inputs: boost_times FUNCTION TABLE ROUNDS.
// Prints nanoseconds a call (fastest round), then the values.

#include <boost/math/distributions/non_central_chi_squared.hpp>
#include <boost/math/distributions/non_central_f.hpp>
#include <boost/math/distributions/non_central_t.hpp>
#include <boost/math/distributions/students_t.hpp>

#include <chrono>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <fstream>
#include <sstream>
#include <string>
#include <vector>

namespace bm = boost::math;
using Row = std::vector<double>;

static double value(const std::string& name, const Row& v) {
    try {
        if (name == "noncentral_t_sf") return cdf(complement(bm::non_central_t(v[0], v[1]), v[2]));
        if (name == "noncentral_t_cdf_far_side") return cdf(bm::non_central_t(v[0], v[1]), v[2]);
        if (name == "noncentral_f_sf") return cdf(complement(bm::non_central_f(v[0], v[1], v[2]), v[3]));
        if (name == "t_upper_quantile") return quantile(complement(bm::students_t(v[0]), v[1]));
        return cdf(complement(bm::non_central_chi_squared(v[0], v[1]), v[2]));
    } catch (const std::exception&) {
        return std::nan("");
    }
}

int main(int argc, char** argv) {
    if (argc < 4) return 2;
    const std::string name = argv[1];
    std::ifstream file(argv[2]);
    std::vector<Row> rows;
    for (std::string line; std::getline(file, line);) {
        std::istringstream fields(line);
        Row row;
        for (std::string field; std::getline(fields, field, ',');) row.push_back(std::atof(field.c_str()));
        rows.push_back(row);
    }
    std::vector<double> values(rows.size());
    double best = 1e300;
    for (int round = 0; round < std::atoi(argv[3]); ++round) {
        const auto start = std::chrono::steady_clock::now();
        for (std::size_t i = 0; i < rows.size(); ++i) values[i] = value(name, rows[i]);
        const std::chrono::duration<double, std::nano> spent = std::chrono::steady_clock::now() - start;
        best = std::fmin(best, spent.count() / rows.size());
    }
    std::printf("%.1f\n", best);
    for (double x : values) std::printf("%.17g\n", x);
}
