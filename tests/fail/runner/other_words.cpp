// expect: a sentence that the compiler never says
// runner: the first error does not hold the words
static_assert(sizeof(int) == 1, "another sentence");
int main() { return 0; }
