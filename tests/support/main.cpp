#define BOOST_TEST_MODULE kiloamp
#include <boost/test/unit_test.hpp>
