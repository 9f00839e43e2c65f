int main() { return missing; }
