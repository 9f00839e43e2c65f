// expect: our sentence comes second
// runner: the first error does not hold the words
static_assert(sizeof(int) == 1, "something else comes first");
static_assert(sizeof(int) == 1, "our sentence comes second");
int main() { return 0; }
