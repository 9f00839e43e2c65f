// expect: missing
// runner: the legal twin does not compile
int main() { return missing; }
