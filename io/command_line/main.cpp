#include <iostream>

#include "io/command_line/run.hpp"

int main(int argc, char** argv) { return kiloamp::run({argv + 1, argv + argc}, std::cout, std::cerr); }
